using Stacks.Abstractions;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>Frames in, frames out: order, workers, faults, cancellation.</summary>
public class FlowTests
{
    private static readonly FrameLayout Small = new() { Width = 4, Height = 3, SampleType = SampleType.UInt16 };

    private static Bench WithFrames(int count)
    {
        Bench bench = new();
        for (int f = 0; f < count; f++)
            bench.Source.Add(Small, [.. Enumerable.Range(0, 12).Select(i => (ushort)((f * 12) + i))]);
        return bench;
    }

    [Fact]
    public void Without_steps_the_bits_come_out_as_they_went_in()
    {
        using Bench bench = WithFrames(7);
        MemoryWriter written = bench.Run(bench.Plan());
        Assert.Equal(7, written.Frames.Count);
        for (int f = 0; f < 7; f++)
            Assert.Equal(bench.Source.Stored(f), written.Frames[f]);
        Assert.Equal(["in.mem", "out.mem", "out.mem.mask", "out.mem.prov.json"], bench.FilesThere);
    }

    [Theory]
    [InlineData(1, 1)]
    [InlineData(2, 3)]
    [InlineData(5, 2)]
    [InlineData(5, 9)]
    public void Any_number_of_workers_gives_the_same_file(int workers, int inFlight)
    {
        using Bench bench = WithFrames(40);
        MemoryWriter written = bench.Run(bench.Plan(FakeFilter.Cap(100, 7)) with { Workers = workers, FramesInFlight = inFlight });
        for (int f = 0; f < 40; f++)
        {
            for (int i = 0; i < 12; i++)
            {
                int v = (f * 12) + i;
                Assert.Equal(v > 100 ? 7 : v, BitConverter.ToUInt16(written.Frames[f], 2 * i));
            }
        }
    }
}
