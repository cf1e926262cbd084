using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Which of several exit codes is the worst.</summary>
public static class ExitOrder
{
    /// <summary>
    /// Worst first. Stopped stands above all others: work is left, and whatever else was met is met again when the same
    /// command is run again. Then what harms every stack of a night (a fault of the program, failing disks, outputs
    /// that cannot be made, the recipe), then what harms one (its data, its absence), then unmet requirements.
    /// </summary>
    public static IReadOnlyList<int> WorstFirst { get; } =
    [
        ExitCodes.Stopped, ExitCodes.Internal, ExitCodes.InputOutput, ExitCodes.CannotCreate, ExitCodes.BadRecipe,
        ExitCodes.Usage, ExitCodes.BadInput, ExitCodes.NoInput, ExitCodes.RequirementNotMet, ExitCodes.Done,
    ];

    /// <summary>The worst of some codes; <see cref="ExitCodes.Done"/> when there are none.</summary>
    public static int Worst(IEnumerable<int> codes)
    {
        HashSet<int> met = [.. codes];
        return WorstFirst.FirstOrDefault(met.Contains);
    }

    /// <summary>The exit code of an error.</summary>
    public static int CodeOf(Exception fault) => fault switch
    {
        StacksException known => known.ExitCode,
        OperationCanceledException => ExitCodes.Stopped,
        _ => ExitCodes.Internal,
    };
}
