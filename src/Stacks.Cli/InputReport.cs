using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>What is said of the inputs before the work begins.</summary>
internal static class InputReport
{
    /// <summary>A line on stderr for a folder or a pattern that names files which are no stacks.</summary>
    public static void Skipped(InputSet input)
    {
        if (input.Skipped > 0)
            Console.Error.WriteLine($"{input.Name}: {Describe.Count(input.Files.Count, "stack")}; {Describe.Count(input.Skipped, "other file")} not taken");
    }
}
