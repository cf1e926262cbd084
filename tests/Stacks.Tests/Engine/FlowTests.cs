using Stacks.Abstractions;
using Stacks.Pipeline;
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

    private static void LeavesNothing(Bench bench) => Assert.Equal(["in.mem"], bench.FilesThere);

    [Fact]
    public void Without_steps_the_bits_come_out_as_they_went_in()
    {
        using Bench bench = WithFrames(7);
        List<RunProgress> progress = [];
        RunResult result = StackRun.Execute(bench.Plan(), new Direct(progress), CancellationToken.None);
        Assert.Equal(7, bench.Format.Last!.Frames.Count);
        for (int f = 0; f < 7; f++)
            Assert.Equal(bench.Source.Stored(f), bench.Format.Last.Frames[f]);
        Assert.Equal(["in.mem", "out.mem", "out.mem.mask", "out.mem.prov.json"], bench.FilesThere);
        Assert.Equal(["out.mem", "out.mem.mask", "out.mem.prov.json"], result.Files.Select(f => Path.GetFileName(f)!));
        Assert.Equal(Enumerable.Range(1, 7).Select(i => new RunProgress(i, 7)), progress);
    }

    [Theory]
    [InlineData(1, 1)]
    [InlineData(2, 3)]
    [InlineData(5, 2)]
    [InlineData(5, 9)]
    [InlineData(100, 100)]
    public void Any_number_of_workers_gives_the_same_frames(int workers, int inFlight)
    {
        using Bench bench = WithFrames(40);
        FakeFilter slow = new("slow", FilterKind.Selective, (_, _, _, context) => Thread.Sleep(context.FrameIndex % 3));
        MemoryWriter written = bench.Run(bench.Plan(slow, FakeFilter.Cap(100, 7)) with { Workers = workers, FramesInFlight = inFlight });
        Assert.Equal(40, written.Frames.Count);
        for (int f = 0; f < 40; f++)
        {
            for (int i = 0; i < 12; i++)
            {
                int v = (f * 12) + i;
                Assert.Equal(v > 100 ? 7 : v, BitConverter.ToUInt16(written.Frames[f], 2 * i));
            }
        }
    }

    [Fact]
    public void Fewer_frames_than_workers_are_cut_into_bands()
    {
        using Bench bench = WithFrames(2);
        int most = 0;
        FakeFilter bands = new("bands", FilterKind.Selective, (_, flags, _, context) =>
        {
            int cuts = 0;
            context.Bands.ForEach(flags.Height, (_, _) => Interlocked.Increment(ref cuts));
            InterlockedMax(ref most, cuts);
        });
        bench.Run(bench.Plan(bands) with { Workers = 5 });
        Assert.Equal(3, most);
        most = 0;
        bench.Run(bench.Plan(bands) with { Workers = 2, OutputPath = bench.Output + "2" });
        Assert.Equal(1, most);
    }

    [Fact]
    public void A_filter_that_throws_OperationCanceledException_does_not_lose_its_frame_silently()
    {
        using Bench bench = WithFrames(10);
        FakeFilter treacherous = new("treacherous", FilterKind.Selective, (_, _, _, context) =>
        {
            if (context.FrameIndex == 4)
                throw new OperationCanceledException("nobody asked");
        });
        PluginException fault = Assert.Throws<PluginException>(() => bench.Run(bench.Plan(treacherous)));
        Assert.Contains("frame 4, step 1 (treacherous)", fault.Message, StringComparison.Ordinal);
        Assert.Equal(ExitCodes.Internal, fault.ExitCode);
        LeavesNothing(bench);
    }

    [Fact]
    public void A_format_that_throws_OperationCanceledException_does_not_lose_its_frame_silently()
    {
        static void Stop(int frame)
        {
            if (frame == 4)
                throw new OperationCanceledException("nobody asked");
        }

        foreach (Action<MemoryReader> arrange in new Action<MemoryReader>[] { r => r.OnRead = Stop, r => r.OnDecode = Stop })
        {
            using Bench bench = WithFrames(10);
            arrange(bench.Source);
            PluginException fault = Assert.Throws<PluginException>(() => bench.Run(bench.Plan()));
            Assert.Contains("frame 4: a plugin stopped", fault.Message, StringComparison.Ordinal);
            LeavesNothing(bench);
        }
    }

    [Fact]
    public void A_filter_that_fails_ends_the_run_with_its_name_and_frame()
    {
        using Bench bench = WithFrames(10);
        FakeFilter broken = new("broken", FilterKind.Smoothing, (_, flags, _, context) =>
            context.Bands.ForEach(flags.Height, (_, _) => throw new InvalidOperationException("two\nlines")));
        PluginException fault = Assert.Throws<PluginException>(() => bench.Run(bench.Plan(broken) with { Workers = 40 }));
        Assert.Contains("(broken): the filter failed: two lines;", fault.Message, StringComparison.Ordinal);
        Assert.IsType<InvalidOperationException>(fault.InnerException);
        LeavesNothing(bench);
    }

    [Fact]
    public void Typed_errors_come_out_as_they_are_from_every_place()
    {
        static void FailAt(int f)
        {
            if (f == 3)
                throw Bad();
        }

        static StackFormatException Bad() => new("in.mem, frame 3", "is broken", "copy it again");
        void Ends(Action<Bench> arrange, FakeFilter? filter = null)
        {
            using Bench bench = WithFrames(8);
            arrange(bench);
            FakeFilter[] filters = filter is null ? [] : [filter];
            Assert.Equal(Bad().Message, Assert.Throws<StackFormatException>(() => bench.Run(bench.Plan(filters) with { Workers = 20 })).Message);
            LeavesNothing(bench);
        }

        Ends(b => b.Source.OnRead = FailAt);
        Ends(b => b.Source.OnDecode = FailAt);
        Ends(b => b.Source.Quality = (f, _) => FailAt(f));
        Ends(b => b.Format.OnComplete = () => throw Bad());
        Ends(b => { }, new FakeFilter("typed", FilterKind.Selective, (_, _, _, c) => c.Bands.ForEach(3, (_, _) => throw Bad())));
    }

    [Fact]
    public void Cancellation_stops_the_run_and_leaves_nothing()
    {
        using Bench bench = WithFrames(50);
        using CancellationTokenSource stop = new();
        FakeFilter stopping = new("stopping", FilterKind.Selective, (_, _, _, context) =>
        {
            if (context.FrameIndex == 10)
                stop.Cancel();
        });
        OperationCanceledException fault = Assert.ThrowsAny<OperationCanceledException>(
            () => StackRun.Execute(bench.Plan(stopping), null, stop.Token));
        Assert.Equal(stop.Token, fault.CancellationToken);
        LeavesNothing(bench);
    }

    private static void InterlockedMax(ref int place, int value)
    {
        int seen;
        while ((seen = place) < value && Interlocked.CompareExchange(ref place, value, seen) != seen)
        {
        }
    }

    private sealed class Direct(List<RunProgress> list) : IProgress<RunProgress>
    {
        public void Report(RunProgress value) => list.Add(value);
    }
}
