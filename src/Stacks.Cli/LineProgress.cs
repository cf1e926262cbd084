using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>
/// Plain lines: one when a stack begins, one for every 10 per cent or 5 minutes but at least 10 seconds apart, one at
/// its end.
/// </summary>
internal sealed class LineProgress(int count, bool verbose) : FaultLines(verbose)
{
    private Rate? rate;
    private string label = "";
    private TimeSpan lastTime;
    private int lastFrames;

    /// <inheritdoc/>
    public override void StackBegins(RunPlan plan, int index, int stacks)
    {
        rate = new Rate(plan);
        lastTime = TimeSpan.Zero;
        lastFrames = 0;
        label = (count > 1 ? $"[{index + 1}/{count}] " : "") + Path.GetFileName(plan.Reader.Path);
        Console.Error.WriteLine($"{label}: {Describe.Frames(plan.Reader.FrameCount)}");
    }

    /// <inheritdoc/>
    public override void FramesWritten(RunProgress progress)
    {
        TimeSpan since = rate!.Elapsed - lastTime;
        bool due = since.TotalMinutes >= 5 || (since.TotalSeconds >= 10 && (progress.FramesDone - lastFrames) * 10L >= progress.FrameCount);
        if (!due || progress.FramesDone == progress.FrameCount)
            return;
        lastTime = rate.Elapsed;
        lastFrames = progress.FramesDone;
        Console.Error.WriteLine($"{label}: {progress.FramesDone} of {progress.FrameCount} frames, {rate.Speed(progress.FramesDone)}, {Rate.Clock(rate.Left(progress))} left");
    }

    /// <inheritdoc/>
    public override void StackEnds(NightEntry entry)
    {
        base.StackEnds(entry);
        if (entry.Result is { Outcome: RunOutcome.Made } result)
            Console.Error.WriteLine($"{label}: done in {Rate.Clock(entry.Elapsed)}, {rate!.Speed(result.Provenance?.Totals.Frames ?? 0)}");
        else if (entry.Result is { Outcome: not RunOutcome.PartOfAnother })
            Console.Error.WriteLine($"{label}: done before, left as it is");
    }
}
