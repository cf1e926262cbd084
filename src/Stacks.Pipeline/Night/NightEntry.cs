using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>What became of one input.</summary>
/// <param name="Item">The input and its output's name.</param>
/// <param name="Plan">Its plan, closed; null when it could not be planned.</param>
/// <param name="Result">Its result; null when it was only planned, failed or was stopped.</param>
/// <param name="Fault">Why it failed; null when it did not.</param>
/// <param name="Elapsed">Time from opening the input to the end.</param>
public sealed record NightEntry(NamedOutput Item, RunPlan? Plan, RunResult? Result, Exception? Fault, TimeSpan Elapsed)
{
    /// <summary>The exit code it would have alone.</summary>
    public int ExitCode => Fault is null ? ExitCodes.Done : ExitOrder.CodeOf(Fault);
}

/// <summary>Is told how the night goes on. Called by one thread at a time.</summary>
public interface INightProgress
{
    /// <summary>A stack begins.</summary>
    /// <param name="plan">Its plan.</param>
    /// <param name="index">Its place among the inputs, from 0.</param>
    /// <param name="count">Inputs in all.</param>
    void StackBegins(RunPlan plan, int index, int count);

    /// <summary>Frames were written.</summary>
    void FramesWritten(RunProgress progress);

    /// <summary>A stack ended, or failed before it began.</summary>
    void StackEnds(NightEntry entry);
}
