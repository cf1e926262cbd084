using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// The output's files from their partial names to their final ones. The sidecar gets its final name first and the stack
/// last: a stack under its final name has its sidecar, and a crash in between leaves a stack whose digest the sidecar
/// does not name, or none.
/// </summary>
internal static class OutputFiles
{
    /// <summary>Ending of the provenance beside an output.</summary>
    public const string SidecarEnding = ".prov.json";

    /// <summary>Ending of a file that is not complete.</summary>
    public const string PartialEnding = ".partial";

    /// <summary>Path of the sidecar of a stack.</summary>
    public static string SidecarOf(string path) => path + SidecarEnding;

    /// <summary>Path under which a file is written until it is complete.</summary>
    public static string PartialOf(string path) => path + PartialEnding;

    /// <summary>
    /// True when the output is there and is what this work makes; false when nothing is in the way (or it may be
    /// overwritten).
    /// </summary>
    /// <param name="plan">The plan.</param>
    /// <param name="workDigest">Gives the digest of this work; asked for only when it is needed.</param>
    /// <param name="cancellation">Cancellation.</param>
    /// <exception cref="OutputException">Something else is in the way.</exception>
    public static bool IsDone(RunPlan plan, Func<string> workDigest, CancellationToken cancellation)
    {
        string path = plan.OutputPath, sidecar = SidecarOf(path);
        if (File.Exists(path))
        {
            string? why = Difference(path, sidecar, workDigest, cancellation);
            if (why is null)
                return true;
            if (!plan.Overwrite)
                throw InTheWay(path, why);
        }

        RefuseOthers(plan, [PartialOf(path), PartialOf(sidecar), sidecar]);
        return false;
    }

    /// <summary>Refuses files that are in the way of an output's companions.</summary>
    public static void RefuseOthers(RunPlan plan, IEnumerable<string> paths)
    {
        if (!plan.Overwrite && paths.FirstOrDefault(File.Exists) is { } there)
            throw InTheWay(there, there.EndsWith(PartialEnding, StringComparison.Ordinal) ? "is left from a run that did not end" : "exists already");
    }

    /// <summary>Syncs partial files.</summary>
    /// <param name="files">The files, written and closed.</param>
    /// <param name="sync">fsync of a path; see <see cref="Durable.Sync"/>.</param>
    public static void Sync(IReadOnlyList<OutputFile> files, Action<string> sync)
    {
        foreach (OutputFile file in files)
            sync(file.Partial);
    }

    /// <summary>Renames partial files that have been synced, and syncs their folder.</summary>
    /// <param name="files">In the order in which they get their final names.</param>
    /// <param name="overwrite">Replace what has a final name already.</param>
    /// <param name="sync">fsync of a path; see <see cref="Durable.Sync"/>.</param>
    public static void Commit(IReadOnlyList<OutputFile> files, bool overwrite, Action<string> sync)
    {
        foreach (OutputFile file in files)
        {
            try
            {
                File.Move(file.Partial, file.Final, overwrite);
            }
            catch (Exception fault) when (fault is IOException or UnauthorizedAccessException)
            {
                throw new OutputException(file.Final, $"cannot be given its final name ({fault.Message})", "check the folder", fault);
            }
        }

        sync(Path.GetDirectoryName(Path.GetFullPath(files[0].Final))!);
    }

    /// <summary>Removes partial files; what cannot be removed stays and is refused by name next time.</summary>
    public static void Abandon(IEnumerable<OutputFile> files)
    {
        foreach (OutputFile file in files)
        {
            try
            {
                File.Delete(file.Partial);
            }
            catch (Exception fault) when (fault is IOException or UnauthorizedAccessException)
            {
                // The fault that ended the run is the one to report.
            }
        }
    }

    /// <summary>
    /// Removes companions of a replaced output that the new one does not have, such as its change mask: beside the new
    /// stack they would tell of changes that were not made. A file that is not as its provenance says stays.
    /// </summary>
    /// <param name="folder">Folder of the output.</param>
    /// <param name="companions">Companions as the replaced output's sidecar names them.</param>
    /// <param name="made">Files of the new output.</param>
    public static void RemoveStale(string folder, IEnumerable<NamedDigest> companions, IEnumerable<NamedDigest> made)
    {
        foreach (NamedDigest stale in companions.Where(c => !made.Any(m => m.Name == c.Name)))
        {
            string path = Path.Combine(folder, Path.GetFileName(stale.Name));
            if (File.Exists(path) && Digests.OfFile(path, CancellationToken.None) == stale.Digest)
                Abandon([new OutputFile(path, path)]);
        }
    }

    private static string? Difference(string path, string sidecar, Func<string> workDigest, CancellationToken cancellation)
    {
        if (!File.Exists(sidecar))
            return "exists already and has no provenance beside it";
        SidecarDigests? told = Sidecar.Read(sidecar);
        if (told is null || told.Work != workDigest())
            return "exists already and was made from another input, recipe or plugin";
        return told.Output == Digests.OfFile(path, cancellation) ? null : "exists already and is not as its provenance says";
    }

    private static OutputException InTheWay(string path, string why) => new(path, why, "give --overwrite to replace it");
}
