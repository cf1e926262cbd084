using System.Diagnostics;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Runs one stack by its plan.</summary>
/// <param name="plan">The plan.</param>
/// <param name="progress">Is told of frames written.</param>
/// <param name="cancellation">Stops the run.</param>
public delegate RunResult RunStack(RunPlan plan, IProgress<RunProgress>? progress, CancellationToken cancellation);

/// <summary>
/// The loop over the inputs of a night, one stack after the other. An input that fails is set down in its entry and
/// does not keep the others from being done.
/// </summary>
public static class NightRun
{
    /// <summary>Plans and runs every input.</summary>
    /// <param name="items">Inputs with the names of their outputs.</param>
    /// <param name="planner">Makes the plans.</param>
    /// <param name="run">Runs a plan; null to plan only.</param>
    /// <param name="progress">Is told how it goes on.</param>
    /// <param name="cancellation">Stops the night: the stack in hand ends as stopped, later ones are not begun.</param>
    /// <returns>An entry for each input, in order.</returns>
    /// <exception cref="OutputException">An output folder cannot be created.</exception>
    public static IReadOnlyList<NightEntry> Execute(
        IReadOnlyList<NamedOutput> items, RunPlanner planner, RunStack? run, INightProgress progress, CancellationToken cancellation)
    {
        if (run is not null)
            CreateFolders(items);
        List<NightEntry> entries = [];
        Dictionary<string, string> coveredBy = [];
        for (int i = 0; i < items.Count; i++)
        {
            NightEntry entry = coveredBy.TryGetValue(RealPath.Of(items[i].Input), out string? other)
                ? new NightEntry(items[i], null, new RunResult(RunOutcome.PartOfAnother, null, [], [$"a file of the stack of {other}"]), null, TimeSpan.Zero)
                : One(items[i], i, items.Count, planner, run, progress, cancellation);
            foreach (string file in entry.Plan?.Reader.OtherFiles ?? [])
                coveredBy.TryAdd(RealPath.Of(file), items[i].Input);
            progress.StackEnds(entry);
            entries.Add(entry);
        }

        return entries;
    }

    private static NightEntry One(
        NamedOutput item, int index, int count, RunPlanner planner, RunStack? run, INightProgress progress, CancellationToken cancellation)
    {
        long start = Stopwatch.GetTimestamp();
        RunPlan? plan = null;
        RunResult? result = null;
        Exception? fault = null;
        try
        {
            cancellation.ThrowIfCancellationRequested();
            plan = planner.Plan(item);
            progress.StackBegins(plan, index, count);
            result = run?.Invoke(plan, new Relay(progress), cancellation);
        }
#pragma warning disable CA1031 // One stack's fault, whatever it is, must not keep the others from being done; the summary names it.
        catch (Exception e)
#pragma warning restore CA1031
        {
            fault = e;
        }
        finally
        {
            plan?.Dispose();
        }

        return new NightEntry(item, plan, result, fault, Stopwatch.GetElapsedTime(start));
    }

    private static void CreateFolders(IReadOnlyList<NamedOutput> items)
    {
        foreach (string folder in items.Where(i => i.Fault is null).Select(i => Path.GetDirectoryName(Path.GetFullPath(i.Output))!).Distinct())
        {
            try
            {
                Directory.CreateDirectory(folder);
            }
            catch (Exception e) when (e is IOException or UnauthorizedAccessException)
            {
                throw new OutputException(folder, "the output folder cannot be created: " + e.Message.TrimEnd('.'), "check its parent's permissions, or give -o another folder", e);
            }
        }
    }

    /// <summary>Hands progress on at once, on the thread that reports it.</summary>
    private sealed class Relay(INightProgress progress) : IProgress<RunProgress>
    {
        private readonly Lock gate = new();

        public void Report(RunProgress value)
        {
            lock (gate)
                progress.FramesWritten(value);
        }
    }
}
