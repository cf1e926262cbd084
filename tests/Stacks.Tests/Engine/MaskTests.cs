using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>The recipe's mask and defect images.</summary>
public class MaskTests
{
    private static readonly FrameLayout Row = new() { Width = 4, Height = 1, SampleType = SampleType.UInt16 };

    private static RunPlan WithImages(Bench bench, RunPlan plan, Func<string, IStackReader> open) => plan with
    {
        Recipe = plan.Recipe with { Input = new InputSection { Mask = Path.Combine(bench.Folder, "mask.mem"), Defects = Path.Combine(bench.Folder, "defects.mem") } },
        OpenStack = open,
    };

    private static MemoryReader Image(string path) => path.EndsWith("mask.mem", StringComparison.Ordinal)
        ? new MemoryReader(path).Add<byte>(Row with { SampleType = SampleType.UInt8 }, 0, 1, 0, 0)
        : new MemoryReader(path).Add<float>(Row with { SampleType = SampleType.Float32 }, 0, 0, -0.5f, float.NaN);

    [Fact]
    public void Nonzero_samples_are_missing_or_defects_in_every_frame()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row, 1, 2, 3, 4).Add<ushort>(Row, 5, 6, 7, 8);
        MemoryWriter written = bench.Run(WithImages(bench, bench.Plan(), Image));
        byte missing = (byte)SampleFlags.Missing, defect = (byte)SampleFlags.Defect;
        Assert.All(written.Flags, f => Assert.Equal([0, missing, defect, defect], f));
        Assert.Equal(8, written.Ledger[0].FluxIn);
        Assert.Contains(written.Provenance!.Remarks, r => r.Contains("defects", StringComparison.Ordinal));
    }

    [Fact]
    public void An_image_of_another_shape_is_refused_by_name()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row, 1, 2, 3, 4).Add<ushort>(Row with { Width = 2, Height = 2 }, 5, 6, 7, 8);
        StackFormatException fault = Assert.Throws<StackFormatException>(() => bench.Run(WithImages(bench, bench.Plan(), Image)));
        Assert.StartsWith("mask.mem: is 4 x 1 samples, but frame 1 is 2 x 2", fault.Message, StringComparison.Ordinal);
        Assert.DoesNotContain(bench.FilesThere, f => f.StartsWith("out", StringComparison.Ordinal));
    }

    [Fact]
    public void A_stack_of_images_is_refused_and_other_images_are_other_work()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row, 1, 2, 3, 4);
        RunPlan plan = WithImages(bench, bench.Plan(), Image);
        Assert.Throws<StackFormatException>(() => bench.Run(plan with { OpenStack = path => Image(path).Add<byte>(Row with { SampleType = SampleType.UInt8 }, 1, 1, 1, 1) }));

        bench.Run(plan);
        Assert.Equal(RunOutcome.AlreadyDone, StackRun.Execute(plan, null, CancellationToken.None).Outcome);
        RunPlan other = plan with { OpenStack = path => new MemoryReader(path).Add<ushort>(Row, 0, 0, 0, 1) };
        Assert.Throws<OutputException>(() => StackRun.Execute(other, null, CancellationToken.None));
    }
}
