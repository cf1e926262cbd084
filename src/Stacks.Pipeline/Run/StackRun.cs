using System.Globalization;
using System.Reflection;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Pipeline;

/// <summary>The run of one stack: from a plan to files under their final names, or to none.</summary>
public static class StackRun
{
    /// <summary>Runs a plan.</summary>
    /// <param name="plan">Everything resolved; its reader stays open.</param>
    /// <param name="progress">Told after every frame written; may be null.</param>
    /// <param name="cancellation">Stops the run; partial files are removed.</param>
    /// <returns>What was made, or that it was there already.</returns>
    /// <exception cref="StacksException">Bad input, an output in the way, a failing disk, a failing plugin.</exception>
    /// <exception cref="OperationCanceledException">The token was cancelled.</exception>
    public static RunResult Execute(RunPlan plan, IProgress<RunProgress>? progress, CancellationToken cancellation) =>
        Execute(plan, progress, Durable.Sync, cancellation);

    /// <summary>The same with another way to sync a path, for tests of failing disks.</summary>
    internal static RunResult Execute(RunPlan plan, IProgress<RunProgress>? progress, Action<string> sync, CancellationToken cancellation)
    {
        using CancellationTokenSource ended = CancellationTokenSource.CreateLinkedTokenSource(cancellation);
        Task<string> sourceDigest = Beside(() => Digests.OfFile(plan.Reader.Path, ended.Token));
        Task<NamedDigest[]> otherDigests = Beside(
            () => plan.Reader.OtherFiles.Select(f => new NamedDigest(Path.GetFileName(f), Digests.OfFile(f, ended.Token))).ToArray());
        Task<string[]> damage = Beside(
            () => plan.Reader.CheckHealth(ended.Token).Where(f => f.IsProblem).Select(f => $"the source is damaged: {f.Text}").ToArray());
        try
        {
            FrameMasks masks = new(plan, cancellation);
            string WorkDigest() => Digests.OfWork(plan, Software.Version, sourceDigest.GetAwaiter().GetResult(), otherDigests.GetAwaiter().GetResult(), masks.Files);
            if (OutputFiles.IsDone(plan, WorkDigest, cancellation))
                return new RunResult(RunOutcome.AlreadyDone, null, [plan.OutputPath], []);
            return Make(plan, masks, sourceDigest, otherDigests, damage, WorkDigest, progress, sync, cancellation);
        }
        finally
        {
            ended.Cancel();
        }
    }

    private static RunResult Make(
        RunPlan plan,
        FrameMasks masks,
        Task<string> sourceDigest,
        Task<NamedDigest[]> otherDigests,
        Task<string[]> damage,
        Func<string> workDigest,
        IProgress<RunProgress>? progress,
        Action<string> sync,
        CancellationToken cancellation)
    {
        DateTimeOffset created = Software.Now();
        RunAccount account = new(plan);
        OutputFile sidecar = new(OutputFiles.PartialOf(OutputFiles.SidecarOf(plan.OutputPath)), OutputFiles.SidecarOf(plan.OutputPath));
        IReadOnlyList<NamedDigest> replaced = Sidecar.Read(sidecar.Final)?.Companions ?? [];
        IReadOnlyList<OutputFile> written = [];
        try
        {
            using (IStackWriter writer = plan.OutputFormat.Create(RequestOf(plan, created)))
            {
                written = writer.Files;
                OutputFiles.RefuseOthers(plan, written.Skip(1).Select(f => f.Final));
                RunFrames(plan, masks, writer, account, progress, cancellation);
                account.Finish(sourceDigest.GetAwaiter().GetResult(), workDigest(), created, damage.GetAwaiter().GetResult());
                writer.Complete(account.Provenance, account.Ledger);
            }

            Task synced = Beside(() => OutputFiles.Sync(written, sync)); // the disk writes while the digests are taken
            NamedDigest[] made = [.. written.Select(f => new NamedDigest(Path.GetFileName(f.Final), Digests.OfFile(f.Partial, cancellation)))];
            Sidecar.Write(sidecar.Partial, account.Provenance, plan, otherDigests.GetAwaiter().GetResult(), masks.Files, made);
            OutputFiles.Sync([sidecar], sync);
            synced.GetAwaiter().GetResult();
            cancellation.ThrowIfCancellationRequested();
            OutputFiles.Commit([sidecar, .. written.Reverse()], plan.Overwrite, sync);
            OutputFiles.RemoveStale(Path.GetDirectoryName(Path.GetFullPath(plan.OutputPath))!, replaced, made);
        }
        catch
        {
            OutputFiles.Abandon([sidecar, .. written]);
            throw;
        }

        return new RunResult(RunOutcome.Made, account.Provenance, [.. written.Select(f => f.Final), sidecar.Final], account.Warnings)
        {
            Ledger = account.Ledger,
        };
    }

    /// <summary>Work on a thread of its own: the pool's threads are for frames.</summary>
    private static Task<T> Beside<T>(Func<T> work) => Task.Factory.StartNew(work, CancellationToken.None, TaskCreationOptions.LongRunning, TaskScheduler.Default);

    private static Task Beside(Action work) => Task.Factory.StartNew(work, CancellationToken.None, TaskCreationOptions.LongRunning, TaskScheduler.Default);

    private static WriteRequest RequestOf(RunPlan plan, DateTimeOffset created) => new()
    {
        Source = plan.Reader,
        Path = plan.OutputPath,
        SampleTypeOf = frame => plan.OutputTypeOf(plan.LayoutOf(frame)),
        Mask = plan.WriteMask,
        Compression = plan.Recipe.Output.Compression,
        Carry = plan.Recipe.Output.Carry,
        Created = created,
    };

    private static void RunFrames(
        RunPlan plan, FrameMasks masks, IStackWriter writer, RunAccount account, IProgress<RunProgress>? progress, CancellationToken cancellation)
    {
        int frames = plan.Reader.FrameCount;
        IRowBands bands = frames < plan.Workers ? new ParallelBands((plan.Workers + frames - 1) / frames) : SerialBands.Instance;
        FrameProcessor processor = new(plan, new PreparedSteps(plan), masks, new NoiseModels(plan), writer, bands, cancellation);
        using FrameGraph graph = new(plan.Reader, writer, plan.Workers, plan.FramesInFlight);
        graph.Run(
            processor.Process,
            slot =>
            {
                account.Add(slot.Account!);
                progress?.Report(new RunProgress(slot.Frame + 1, frames));
            },
            cancellation);
    }
}

/// <summary>The program's name, version and clock, as provenance names them.</summary>
internal static class Software
{
    /// <summary>Name of the program.</summary>
    public const string Name = "stacks";

    /// <summary>Version of the program.</summary>
    public static string Version { get; } =
        typeof(Software).Assembly.GetCustomAttribute<AssemblyInformationalVersionAttribute>()?.InformationalVersion ?? "0";

    /// <summary>SOURCE_DATE_EPOCH (reproducible-builds.org: seconds since 1970, UTC) where it is set, else now; whole seconds.</summary>
    public static DateTimeOffset Now()
    {
        string? epoch = Environment.GetEnvironmentVariable("SOURCE_DATE_EPOCH");
        return DateTimeOffset.FromUnixTimeSeconds(
            long.TryParse(epoch, NumberStyles.None, CultureInfo.InvariantCulture, out long seconds) && seconds <= 253402300799
                ? seconds
                : DateTimeOffset.UtcNow.ToUnixTimeSeconds());
    }
}
