using Spectre.Console;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>Progress on stderr: a live line on a terminal, plain lines elsewhere.</summary>
internal static class Progress
{
    /// <summary>Does the night's work under the progress that fits stderr.</summary>
    public static T Watch<T>(int count, bool verbose, Func<INightProgress, T> work)
    {
        if (Console.IsErrorRedirected)
            return work(new LineProgress(count, verbose));
        IAnsiConsole console = AnsiConsole.Create(new AnsiConsoleSettings { Out = new AnsiConsoleOutput(Console.Error) });
        RateColumn rate = new();
        return console.Progress()
            .AutoClear(true)
            .HideCompleted(true)
            .Columns(new TaskDescriptionColumn(), new ProgressBarColumn { Width = 10 }, new PercentageColumn(), rate, new RemainingTimeColumn())
            .Start(context => work(new TerminalProgress(console, context, rate, count, verbose)));
    }
}

/// <summary>Says nothing but what went wrong.</summary>
internal class FaultLines(bool verbose) : INightProgress
{
    /// <inheritdoc/>
    public virtual void StackBegins(RunPlan plan, int index, int count)
    {
    }

    /// <inheritdoc/>
    public virtual void FramesWritten(RunProgress progress)
    {
    }

    /// <inheritdoc/>
    public virtual void StackEnds(NightEntry entry)
    {
        if (entry.Fault is not null)
            ErrorLine.Write(entry.Fault, verbose);
    }
}
