using Spectre.Console;
using Spectre.Console.Rendering;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>A live bar for the stack in hand; what has ended stays above it as plain lines.</summary>
internal sealed class TerminalProgress(IAnsiConsole console, ProgressContext context, RateColumn rate, int count, bool verbose) : INightProgress
{
    private ProgressTask? task;

    /// <inheritdoc/>
    public void StackBegins(RunPlan plan, int index, int stacks)
    {
        string label = (count > 1 ? $"[{index + 1}/{count}] " : "") + Path.GetFileName(plan.Reader.Path);
        task = context.AddTask(Markup.Escape(label), maxValue: plan.Reader.FrameCount);
        rate.Current = new Rate(plan);
    }

    /// <inheritdoc/>
    public void FramesWritten(RunProgress progress) => task!.Value = progress.FramesDone;

    /// <inheritdoc/>
    public void StackEnds(NightEntry entry)
    {
        task?.StopTask();
        task = null;
        if (entry.Fault is not null)
            console.WriteLine("stacks: " + ErrorLine.Text(entry.Fault) + (verbose ? $"\n{entry.Fault}" : ""));
        else if (entry.Result is { Outcome: not RunOutcome.PartOfAnother })
            console.WriteLine($"{Path.GetFileName(entry.Item.Input)}: {(entry.Result.Outcome == RunOutcome.Made ? "done in " + Rate.Clock(entry.Elapsed) : "done before")}");
    }
}

/// <summary>Frames and megabytes a second of the stack in hand.</summary>
internal sealed class RateColumn : ProgressColumn
{
    /// <summary>The stack's speed; null before the first begins.</summary>
    public Rate? Current { get; set; }

    /// <inheritdoc/>
    public override IRenderable Render(RenderOptions options, ProgressTask task, TimeSpan deltaTime) =>
        new Text($"{(int)task.Value} of {(int)task.MaxValue}, {Current?.Speed((int)task.Value)}");

    /// <inheritdoc/>
    protected override bool NoWrap => true;
}
