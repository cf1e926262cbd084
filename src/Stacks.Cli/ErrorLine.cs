using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>Errors as the user sees them: <c>stacks: WHERE: WHAT; REMEDY</c>.</summary>
internal static class ErrorLine
{
    /// <summary>Writes the line to stderr, with the stack trace when asked for, and returns the exit code.</summary>
    public static int Write(Exception fault, bool verbose)
    {
        Console.Error.WriteLine("stacks: " + Text(fault));
        if (verbose)
            Console.Error.WriteLine(fault);
        return ExitOrder.CodeOf(fault);
    }

    /// <summary>The line without the program's name.</summary>
    public static string Text(Exception fault) => (fault switch
    {
        StacksException known => known.Message,
        OperationCanceledException => "stopped on request; run the same command again to go on",
        OutOfMemoryException => "out of memory; give --memory or --workers a lower value",
        _ => $"internal error: {fault.GetType().Name}: {fault.Message}; run again with --verbose and report it",
    }).ReplaceLineEndings(" ");
}
