using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>Several steps, channels, work types, mosaics, masks.</summary>
public class StepTests
{
    private static FrameLayout Row(SampleType type, int width) => new() { Width = width, Height = 1, SampleType = type };

    private static T[] Samples<T>(byte[] bytes)
        where T : unmanaged => MemoryMarshal.Cast<byte, T>(bytes).ToArray();

    [Fact]
    public void A_later_step_sees_replaced_values_but_no_earlier_decisions()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row(SampleType.UInt16, 4), 1, 500, 50, 2);
        List<byte[]> seen = [];
        FakeFilter second = new("second", FilterKind.Selective, (input, flags, output, _) =>
        {
            seen.Add(MemoryMarshal.AsBytes(flags.Samples).ToArray());
            Assert.Equal([1, 10, 50, 2], input.ToArray());
            flags.Samples[2] |= SampleFlags.ReplacedDark;
            output[2] = 5;
            flags.Samples[3] |= SampleFlags.KeptAsSource;
        });
        MemoryWriter written = bench.Run(bench.Plan(FakeFilter.Cap(100, 10), second));
        Assert.Equal([0, 0, 0, 0], seen[0]);
        Assert.Equal<ushort>([1, 10, 5, 2], Samples<ushort>(written.Frames[0]));
        Assert.Equal([0, (byte)SampleFlags.ReplacedBright, (byte)SampleFlags.ReplacedDark, (byte)SampleFlags.KeptAsSource], written.Flags[0]);
        LedgerRow row = written.Ledger[0];
        Assert.Equal((1, 1, 1), (row.ReplacedBright, row.ReplacedDark, row.KeptAsSource));
        Assert.Equal(490 + 45, row.FluxRemoved);
    }

    [Fact]
    public void Output_at_pixels_that_are_not_flagged_replaced_is_not_used()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row(SampleType.UInt16, 3), 1, 2, 3);
        FakeFilter careless = new("careless", FilterKind.Selective, (input, flags, output, _) =>
        {
            output.Fill(999);
            flags.Samples[1] |= SampleFlags.KeptAsSource;
        });
        Assert.Equal<ushort>([1, 2, 3], Samples<ushort>(bench.Run(bench.Plan(careless)).Frames[0]));
        RunPlan smoothed = bench.Plan(careless, FakeFilter.Scale(2, 0)) with { OutputPath = bench.Output + "2" };
        Assert.Equal([2f, 4f, 6f], Samples<float>(bench.Run(smoothed).Frames[0]));
    }

    [Fact]
    public void A_replaced_defect_is_an_ordinary_sample_to_the_next_step()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row(SampleType.UInt16, 3) with { SaturationStored = 1000 }, 1, 2000, 3);
        bench.Source.Quality = (_, flags) => flags.Samples[1] |= SampleFlags.Defect;
        FakeFilter repair = new("repair", FilterKind.Selective, (input, flags, output, _) =>
        {
            Assert.Equal(SampleFlags.Defect | SampleFlags.Saturated, flags.Samples[1]);
            flags.Samples[1] |= SampleFlags.ReplacedBright;
            output[1] = 2;
        });
        FakeFilter smooth = new("smooth", FilterKind.Smoothing, (input, flags, output, context) =>
        {
            Assert.Equal(SampleFlags.None, flags.Samples[1]);
            Assert.False(context.HasSaturated);
            for (int i = 0; i < input.Length; i++)
                output[i] = input[i] + 0.5;
        })
        { WorkTypes = [WorkType.Float32] };
        MemoryWriter written = bench.Run(bench.Plan(repair, smooth));
        Assert.Equal([1.5f, 2.5f, 3.5f], Samples<float>(written.Frames[0]));
        Assert.Equal([0, (byte)(SampleFlags.Defect | SampleFlags.Saturated | SampleFlags.ReplacedBright), 0], written.Flags[0]);
        Assert.Equal(1, written.Ledger[0].Saturated);
    }

    [Theory]
    [InlineData(SampleType.UInt16, new[] { WorkType.Float32, WorkType.Float64 }, WorkType.Float32)]
    [InlineData(SampleType.UInt16, new[] { WorkType.Float64 }, WorkType.Float64)]
    [InlineData(SampleType.UInt8, new[] { WorkType.UInt16, WorkType.Float64 }, WorkType.UInt16)]
    [InlineData(SampleType.Int8, new[] { WorkType.UInt16, WorkType.Float64 }, WorkType.Float64)]
    [InlineData(SampleType.Float16, new[] { WorkType.UInt16, WorkType.Float64 }, WorkType.Float64)]
    [InlineData(SampleType.Int32, new[] { WorkType.Float32, WorkType.Float64 }, WorkType.Float64)]
    public void A_step_computes_in_the_narrowest_listed_type_that_holds_the_samples(SampleType type, WorkType[] listed, WorkType expected)
    {
        using Bench bench = new();
        bench.Source.Add(Row(type, 2), new byte[2 * type.Size()]);
        FakeFilter filter = new("typed", FilterKind.Selective, (_, _, _, _) => { }) { WorkTypes = listed };
        bench.Run(bench.Plan(filter));
        Assert.Equal(expected, Assert.Single(filter.Prepared).Type);
    }

    [Fact]
    public void A_filter_that_cannot_hold_the_samples_is_refused_with_its_place()
    {
        using Bench bench = new();
        bench.Source.Add<int>(Row(SampleType.Int32, 2), 1, 2);
        FakeFilter narrow = new("narrow", FilterKind.Selective, (_, _, _, _) => { }) { WorkTypes = [WorkType.UInt16, WorkType.Float32] };
        RecipeException fault = Assert.Throws<RecipeException>(() => bench.Run(bench.Plan(narrow)));
        Assert.Contains("recipe.toml:7:1", fault.Message, StringComparison.Ordinal);
        Assert.Equal(["in.mem"], bench.FilesThere);
    }

    [Fact]
    public void A_frame_that_no_array_can_hold_is_refused_before_memory_is_taken()
    {
        using Bench bench = new();
        PreparedSteps steps = new(bench.Plan());
        FrameLayout layout = new() { Width = 70000, Height = 70000, SampleType = SampleType.UInt8 };
        StackFormatException fault = Assert.Throws<StackFormatException>(() => steps.For(layout));
        Assert.Contains("70000 x 70000 samples (uint8, written as uint8) takes more than 2 GiB", fault.Message, StringComparison.Ordinal);
        steps.For(layout with { Width = 30000, Height = 30000 });
    }

    [Fact]
    public void Steps_are_made_ready_once_for_frames_that_differ_only_in_place()
    {
        using Bench bench = new();
        for (int t = 0; t < 20; t++)
        {
            for (int c = 0; c < 2; c++)
                bench.Source.Add<ushort>(Row(SampleType.UInt16, 2) with { Time = t, Channel = c, Z = t % 3, Extension = $"SCI,{t}" }, 1, 200);
        }

        FakeFilter cap = FakeFilter.Cap(100, 7);
        RunPlan plan = bench.Plan() with { Steps = [Bench.Step(cap, "1")], Workers = 1 };
        MemoryWriter written = bench.Run(plan);
        Assert.Equal(1, Assert.Single(cap.Prepared).Layout.Channel);
        for (int f = 0; f < 40; f++)
            Assert.Equal<ushort>([1, (ushort)(f % 2 == 0 ? 200 : 7)], Samples<ushort>(written.Frames[f]));
        Assert.Equal("1", Assert.Single(written.Provenance!.Steps).Channel);
    }

    [Theory]
    [InlineData(4, 4, 2, 2)]
    [InlineData(5, 3, 2, 2)]
    [InlineData(7, 5, 3, 2)]
    [InlineData(6, 1, 2, 2)]
    [InlineData(1, 1, 2, 2)]
    public void A_mosaic_is_filtered_by_sublattice_and_put_together_again(int width, int height, int periodX, int periodY)
    {
        using Bench bench = new();
        FrameLayout layout = new() { Width = width, Height = height, SampleType = SampleType.UInt16, Lattice = new Lattice(periodX, periodY) };
        ushort[] samples = [.. Enumerable.Range(0, width * height).Select(i => (ushort)(10 + i))];
        bench.Source.Add(layout, samples);
        bench.Source.Quality = (_, flags) => flags.Samples[^1] |= SampleFlags.Missing;

        // Each sub-lattice gets its own mean added: what a filter sees is exactly its sub-lattice.
        FakeFilter addMean = new("mean", FilterKind.Smoothing, (input, flags, output, _) =>
        {
            double mean = input.ToArray().Average();
            for (int i = 0; i < input.Length; i++)
                output[i] = flags.Samples[i] == 0 ? input[i] + mean : input[i];
        })
        { WorkTypes = [WorkType.Float64] };
        RunPlan plan = bench.Plan(addMean);
        MemoryWriter written = bench.Run(plan with { Recipe = plan.Recipe with { Output = new OutputSection { Samples = SampleChoice.Float64 } } });
        double[] result = Samples<double>(written.Frames[0]);
        for (int i = 0; i < samples.Length; i++)
        {
            double mean = Enumerable.Range(0, samples.Length)
                .Where(j => (j % width % periodX) == (i % width % periodX) && (j / width % periodY) == (i / width % periodY))
                .Average(j => (double)samples[j]);
            Assert.Equal(i == samples.Length - 1 ? double.NaN : samples[i] + mean, result[i], 1e-9);
        }

        Assert.All(addMean.Prepared, p => Assert.Equal((Math.Max(periodX, periodY), true), (p.Layout.Pitch, p.Layout.Lattice.IsSingle)));
    }

    [Fact]
    public void Selective_steps_on_a_mosaic_keep_all_other_bits_and_their_flags_come_home()
    {
        using Bench bench = new();
        FrameLayout layout = new() { Width = 5, Height = 5, SampleType = SampleType.Int64, Lattice = new Lattice(2, 2) };
        long[] samples = [.. Enumerable.Range(0, 25).Select(i => long.MinValue + i)];
        samples[7] = 1000;
        samples[18] = 2000;
        bench.Source.Add(layout, samples);
        MemoryWriter written = bench.Run(bench.Plan(FakeFilter.Cap(0, -5)));
        samples[7] = samples[18] = -5;
        Assert.Equal(samples, Samples<long>(written.Frames[0]));
        Assert.Equal([7, 18], Enumerable.Range(0, 25).Where(i => written.Flags[0][i] == (byte)SampleFlags.ReplacedBright));
        Assert.Equal(3010, written.Ledger[0].FluxRemoved);
    }

    [Fact]
    public void The_recipe_says_there_is_no_mosaic()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row(SampleType.UInt16, 4) with { Lattice = new Lattice(2, 2) }, 1, 2, 3, 4);
        FakeFilter cap = FakeFilter.Cap(100, 7);
        RunPlan plan = bench.Plan(cap);
        bench.Run(plan with { Recipe = plan.Recipe with { Input = new InputSection { Mosaic = Lattice.Single } } });
        Assert.Equal(4, Assert.Single(cap.Prepared).Layout.Width);
    }
}
