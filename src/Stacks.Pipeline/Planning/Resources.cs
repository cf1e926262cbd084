using System.Globalization;

namespace Stacks.Pipeline;

/// <summary>What a run may use.</summary>
/// <param name="Workers">Threads, 1 or more.</param>
/// <param name="MemoryBytes">Most resident bytes the run should need.</param>
/// <param name="MemoryOrigin">Who set the limit, for plans and errors.</param>
public sealed record Resources(int Workers, long MemoryBytes, string MemoryOrigin)
{
    private const long Mebi = 1 << 20; // Slurm counts memory in these

    /// <summary>
    /// Workers: as given, else SLURM_CPUS_PER_TASK, else SLURM_CPUS_ON_NODE, else the processor count. Memory: as given,
    /// else SLURM_MEM_PER_NODE, else SLURM_MEM_PER_CPU times the processors of the job, else three quarters of what this
    /// machine or container offers.
    /// </summary>
    /// <param name="workers">Given workers; null for none.</param>
    /// <param name="memory">Given bytes; null for none.</param>
    /// <param name="environment">Looks up an environment variable.</param>
    public static Resources Find(int? workers, long? memory, Func<string, string?> environment)
    {
        int? slurm = Whole(environment("SLURM_CPUS_PER_TASK")) ?? Whole(environment("SLURM_CPUS_ON_NODE"));
        int threads = workers ?? slurm ?? Environment.ProcessorCount;
        if (memory is { } given)
            return new Resources(threads, given, "--memory");
        if (Whole(environment("SLURM_MEM_PER_NODE")) is { } perNode)
            return new Resources(threads, perNode * Mebi, "SLURM_MEM_PER_NODE");
        if (Whole(environment("SLURM_MEM_PER_CPU")) is { } perCpu)
            return new Resources(threads, (long)perCpu * (slurm ?? threads) * Mebi, "SLURM_MEM_PER_CPU");
        return new Resources(threads, GC.GetGCMemoryInfo().TotalAvailableMemoryBytes / 4 * 3, "three quarters of this machine's memory");
    }

    /// <summary>A positive whole number; null for anything else (Slurm writes 0 for "all there is").</summary>
    private static int? Whole(string? text) =>
        int.TryParse(text, NumberStyles.None, CultureInfo.InvariantCulture, out int number) && number > 0 ? number : null;
}
