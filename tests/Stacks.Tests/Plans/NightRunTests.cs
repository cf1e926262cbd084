using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Plans;

/// <summary>One stack's fault does not keep the others from being done.</summary>
public sealed class NightRunTests : IDisposable
{
    private static readonly RunResult Made = new(RunOutcome.Made, null, [], []);

    private readonly PlanBench bench = new();
    private readonly Log log = new();

    public void Dispose() => bench.Dispose();

    [Fact]
    public void Faulty_stacks_are_set_down_and_the_rest_is_done()
    {
        string[] inputs = [bench.Put("a.sky", "sky"), bench.Put("b.sky", "text"), bench.File("none.sky"), bench.Put("d.sky", "sky"), bench.Put("e.sky", "sky")];
        List<string> ran = [];

        IReadOnlyList<NightEntry> entries = Run(
            inputs,
            plan =>
            {
                ran.Add(Path.GetFileName(plan.Reader.Path));
                return plan.Reader.Path.EndsWith("d.sky", StringComparison.Ordinal) ? throw new InvalidOperationException("a bug") : Made;
            },
            CancellationToken.None);

        Assert.Equal(["a.sky", "d.sky", "e.sky"], ran);
        Assert.Equal([0, 65, 66, 70, 0], entries.Select(e => e.ExitCode));
        Assert.Equal(inputs, entries.Select(e => e.Item.Input));
        Assert.Equal(["begins a.sky 0/5", "ends a.sky", "ends b.sky", "ends none.sky", "begins d.sky 3/5", "ends d.sky", "begins e.sky 4/5", "ends e.sky"], log.Lines);
        Assert.Equal(bench.Sky.Opened, bench.Sky.Closed);
        Assert.True(Directory.Exists(bench.Out));
    }

    [Fact]
    public void A_stopped_night_does_not_begin_later_stacks()
    {
        using CancellationTokenSource stop = new();
        string[] inputs = [bench.Put("a.sky", "sky"), bench.Put("b.sky", "sky"), bench.Put("c.sky", "sky")];
        int ran = 0;

        IReadOnlyList<NightEntry> entries = Run(
            inputs,
            plan =>
            {
                if (++ran == 1)
                    return Made;
                stop.Cancel();
                stop.Token.ThrowIfCancellationRequested();
                return Made;
            },
            stop.Token);

        Assert.Equal(2, ran);
        Assert.Equal([0, 75, 75], entries.Select(e => e.ExitCode));
    }

    [Fact]
    public void Planning_alone_creates_nothing()
    {
        IReadOnlyList<NamedOutput> items = bench.Name("", bench.Out, bench.Put("a.sky", "sky"));

        NightEntry entry = Assert.Single(NightRun.Execute(items, new RunPlanner(bench.Recipe(""), bench.Catalogue, bench.Resources, false), null, log, CancellationToken.None));

        Assert.NotNull(entry.Plan);
        Assert.Null(entry.Result);
        Assert.False(Directory.Exists(bench.Out));
    }

    [Fact]
    public void An_output_folder_that_cannot_be_made_ends_the_night_before_it_starts()
    {
        bench.Put("out", "a file stands where the folder should be");

        OutputException fault = Assert.Throws<OutputException>(() => Run([bench.Put("a.sky", "sky")], _ => Made, CancellationToken.None));

        Assert.Equal(73, fault.ExitCode);
        Assert.Empty(log.Lines);
    }

    [Theory]
    [InlineData(new int[0], 0)]
    [InlineData(new[] { 0, 0 }, 0)]
    [InlineData(new[] { 0, 1 }, 1)]
    [InlineData(new[] { 66, 65, 1 }, 65)]
    [InlineData(new[] { 65, 78, 66 }, 78)]
    [InlineData(new[] { 78, 73 }, 73)]
    [InlineData(new[] { 73, 74, 0 }, 74)]
    [InlineData(new[] { 74, 70, 65 }, 70)]
    [InlineData(new[] { 70, 75, 0 }, 75)]
    public void Worst_exit_code(int[] met, int worst) => Assert.Equal(worst, ExitOrder.Worst(met));

    private IReadOnlyList<NightEntry> Run(string[] inputs, Func<RunPlan, RunResult> run, CancellationToken cancellation) => NightRun.Execute(
        bench.Name("", bench.Out, inputs), new RunPlanner(bench.Recipe(""), bench.Catalogue, bench.Resources, false), (plan, _, _) => run(plan), log, cancellation);

    private sealed class Log : INightProgress
    {
        public List<string> Lines { get; } = [];

        public void StackBegins(RunPlan plan, int index, int count) => Lines.Add($"begins {Path.GetFileName(plan.Reader.Path)} {index}/{count}");

        public void FramesWritten(RunProgress progress)
        {
        }

        public void StackEnds(NightEntry entry) => Lines.Add("ends " + Path.GetFileName(entry.Item.Input));
    }
}
