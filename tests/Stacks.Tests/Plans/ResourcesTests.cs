using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Plans;

/// <summary>
/// Variables as Slurm sets them in a job (slurm.schedmd.com, sbatch, "OUTPUT ENVIRONMENT VARIABLES": memory in
/// megabytes of 2^20 bytes).
/// </summary>
public class ResourcesTests
{
    private const long Mebi = 1 << 20;

    [Fact]
    public void What_is_given_wins()
    {
        Resources found = Find(3, 5 * Mebi, ("SLURM_CPUS_PER_TASK", "8"), ("SLURM_MEM_PER_NODE", "4096"));

        Assert.Equal((3, 5 * Mebi, "--memory"), (found.Workers, found.MemoryBytes, found.MemoryOrigin));
    }

    [Fact]
    public void Slurm_processors_of_the_task_come_before_those_of_the_node()
    {
        Assert.Equal(8, Find(null, null, ("SLURM_CPUS_PER_TASK", "8"), ("SLURM_CPUS_ON_NODE", "64")).Workers);
        Assert.Equal(64, Find(null, null, ("SLURM_CPUS_ON_NODE", "64")).Workers);
    }

    [Fact]
    public void Slurm_memory_of_the_node_or_of_each_processor()
    {
        Assert.Equal(4096 * Mebi, Find(null, null, ("SLURM_MEM_PER_NODE", "4096"), ("SLURM_MEM_PER_CPU", "1")).MemoryBytes);
        Assert.Equal(8 * 2000 * Mebi, Find(null, null, ("SLURM_MEM_PER_CPU", "2000"), ("SLURM_CPUS_PER_TASK", "8")).MemoryBytes);
        Assert.Equal(3 * 2000 * Mebi, Find(3, null, ("SLURM_MEM_PER_CPU", "2000")).MemoryBytes);
    }

    [Theory]
    [InlineData("0")]
    [InlineData("")]
    [InlineData("many")]
    [InlineData("-4")]
    public void Values_that_say_nothing_are_passed_over(string text)
    {
        Resources found = Find(null, null, ("SLURM_CPUS_PER_TASK", text), ("SLURM_MEM_PER_NODE", text));

        Assert.Equal(Environment.ProcessorCount, found.Workers);
        Assert.InRange(found.MemoryBytes, 1, GC.GetGCMemoryInfo().TotalAvailableMemoryBytes);
    }

    private static Resources Find(int? workers, long? memory, params (string Name, string Value)[] environment) =>
        Resources.Find(workers, memory, name => environment.FirstOrDefault(e => e.Name == name).Value);
}
