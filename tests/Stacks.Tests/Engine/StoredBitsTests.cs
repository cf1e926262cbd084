using System.Numerics;
using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>
/// What reaches the output, sample by sample, in all stored types. Limits of integer types: ISO/IEC 9899 (stdint);
/// binary16, binary32 and binary64: IEEE 754-2019.
/// </summary>
public class StoredBitsTests
{
    private static FrameLayout Row(SampleType type, int width) => new() { Width = width, Height = 1, SampleType = type };

    private static void KeepsBits<T>(SampleType type, T[] samples, T replacement)
        where T : unmanaged, INumber<T>
    {
        using Bench bench = new();
        T limit = samples[^1];
        bench.Source.Add(Row(type, samples.Length), samples);
        FakeFilter replaceLast = new("last", FilterKind.Selective, (input, flags, output, _) =>
        {
            flags.Samples[input.Length - 1] |= SampleFlags.ReplacedBright;
            output[input.Length - 1] = double.CreateTruncating(replacement);
        });
        MemoryWriter written = bench.Run(bench.Plan(replaceLast));
        T[] expected = [.. samples[..^1], replacement];
        Assert.NotEqual(limit, replacement);
        Assert.Equal(MemoryMarshal.AsBytes<T>(expected).ToArray(), written.Frames[0]);
        Assert.Equal(1, written.Ledger[0].ReplacedBright);
        Assert.Equal(LedgerFlags.None, written.Ledger[0].Flags & LedgerFlags.OutOfRange);
    }

    [Fact]
    public void Samples_that_are_not_replaced_keep_their_bits_in_every_type()
    {
        KeepsBits<byte>(SampleType.UInt8, [0, 1, 127, 128, 255, 9], 3);
        KeepsBits<sbyte>(SampleType.Int8, [0, -1, sbyte.MinValue, sbyte.MaxValue, 9], -3);
        KeepsBits<ushort>(SampleType.UInt16, [0, 1, 32767, 32768, 65535, 9], 3);
        KeepsBits<short>(SampleType.Int16, [0, -1, short.MinValue, short.MaxValue, 9], -3);
        KeepsBits<uint>(SampleType.UInt32, [0, 1, 0x80000000, uint.MaxValue, 9], 3);
        KeepsBits<int>(SampleType.Int32, [0, -1, int.MinValue, int.MaxValue, 9], -3);
        KeepsBits<ulong>(SampleType.UInt64, [0, (1UL << 53) + 1, (1UL << 63) + 1, ulong.MaxValue, ulong.MaxValue - 1, 9], 3);
        KeepsBits<long>(SampleType.Int64, [0, (1L << 53) + 1, long.MinValue, long.MinValue + 1, long.MaxValue, long.MaxValue - 1, 9], -3);
        KeepsBits<Half>(SampleType.Float16, [Half.Zero, Half.NegativeZero, Half.NaN, Half.PositiveInfinity, Half.NegativeInfinity, Half.Epsilon, Half.MaxValue, (Half)9], (Half)3);
        KeepsBits<float>(SampleType.Float32, [0, -0f, BitConverter.Int32BitsToSingle(0x7fc01234), float.PositiveInfinity, float.NegativeInfinity, float.Epsilon, float.MaxValue, 9], 3.25f);
        KeepsBits<double>(SampleType.Float64, [0, -0.0, BitConverter.Int64BitsToDouble(0x7ff8000000001234), double.PositiveInfinity, double.NegativeInfinity, double.Epsilon, double.MaxValue, 9], 3.25);
    }

    [Theory]
    [InlineData(1e300, long.MaxValue, true)]
    [InlineData(-1e300, long.MinValue, true)]
    [InlineData(9223372036854775807.0, long.MaxValue, false)]
    [InlineData(2.5, 2, false)]
    [InlineData(3.5, 4, false)]
    [InlineData(-2.5, -2, false)]
    public void A_replacement_is_rounded_half_to_even_and_held_at_the_ends(double replacement, long expected, bool held)
    {
        using Bench bench = new();
        bench.Source.Add<long>(Row(SampleType.Int64, 2), long.MinValue + 1, 100);
        MemoryWriter written = bench.Run(bench.Plan(FakeFilter.Cap(50, replacement)));
        Assert.Equal([long.MinValue + 1, expected], MemoryMarshal.Cast<byte, long>(written.Frames[0]).ToArray());
        Assert.Equal(held, written.Ledger[0].Flags.HasFlag(LedgerFlags.OutOfRange));
    }

    [Fact]
    public void A_scaled_sample_goes_through_its_transform_both_ways()
    {
        using Bench bench = new();
        FrameLayout layout = Row(SampleType.Int16, 4) with { Transform = new ValueTransform(-0.5, 100), QuantisationStep = 0.5 };

        // Values 100, 95, 110, 300; only 300 is above 200, and becomes 107.75: stored -15.5, rounded to -16.
        bench.Source.Add<short>(layout, 0, 10, -20, -400);
        MemoryWriter written = bench.Run(bench.Plan(FakeFilter.Cap(200, 107.75)));
        Assert.Equal([0, 10, -20, -16], MemoryMarshal.Cast<byte, short>(written.Frames[0]).ToArray());
        LedgerRow row = written.Ledger[0];
        Assert.Equal(605, row.FluxIn);
        Assert.Equal(300 - 108, row.FluxRemoved);
        Assert.Equal(413, row.FluxOut);
    }

    [Fact]
    public void Smoothed_integers_of_the_same_type_are_rounded_held_and_flagged()
    {
        using Bench bench = new();
        FrameLayout layout = Row(SampleType.UInt16, 6) with { Blank = 7, SaturationStored = 60000 };
        bench.Source.Add<ushort>(layout, 7, 60000, 5, 3, 50000, 1);
        FakeFilter scale = new("scale", FilterKind.Smoothing, (input, flags, output, _) =>
        {
            for (int i = 0; i < input.Length; i++)
                output[i] = (1.5 * input[i]) - 4;
        })
        { WorkTypes = [WorkType.Float32] };
        RunPlan plan = bench.Plan(scale);
        MemoryWriter written = bench.Run(plan with { Recipe = plan.Recipe with { Output = new OutputSection { Samples = SampleChoice.Same } } });

        // 1.5 v - 4: 5 -> 3.5 -> 4 (even), 3 -> 0.5 -> 0 (even), 50000 -> 74996 -> 65535, 1 -> -2.5 -> 0.
        Assert.Equal([7, 60000, 4, 0, 65535, 0], MemoryMarshal.Cast<byte, ushort>(written.Frames[0]).ToArray());
        Assert.Equal([1, 2, 0, 0, 0, 0], written.Flags[0]);
        Assert.True(written.Ledger[0].Flags.HasFlag(LedgerFlags.OutOfRange));
        Assert.Equal(60000 + 4 + 65535, written.Ledger[0].FluxOut);
        Assert.Equal(60000 + 5 + 3 + 50000 + 1, written.Ledger[0].FluxIn);
        Assert.Equal(written.Ledger[0].FluxIn - written.Ledger[0].FluxOut, written.Ledger[0].FluxRemoved);
    }

    [Fact]
    public void Missing_integers_become_NaN_in_floats()
    {
        using Bench bench = new();
        bench.Source.Add<int>(Row(SampleType.Int32, 3) with { Blank = int.MinValue }, int.MinValue, 5, -5);
        MemoryWriter written = bench.Run(bench.Plan(FakeFilter.Scale(2, 1)));
        Assert.Equal([double.NaN, 11, -9], MemoryMarshal.Cast<byte, double>(written.Frames[0]).ToArray());
        Assert.Equal(1, written.Ledger[0].Missing);
    }

    [Fact]
    public void Infinities_keep_place_and_sign_and_masked_samples_become_NaN_only_where_the_type_changes()
    {
        using Bench bench = new();
        float payload = BitConverter.Int32BitsToSingle(0x7fc01234);
        bench.Source.Add(Row(SampleType.Float32, 5), float.PositiveInfinity, float.NegativeInfinity, payload, 4f, 8f);
        bench.Source.Quality = (_, flags) => flags.Samples[3] |= SampleFlags.Missing;
        RunPlan plan = bench.Plan(FakeFilter.Scale(2, 0));
        MemoryWriter same = bench.Run(plan);
        Assert.Equal(MemoryMarshal.AsBytes<float>([float.PositiveInfinity, float.NegativeInfinity, payload, 4f, 16f]).ToArray(), same.Frames[0]);
        Assert.Equal([1, 1, 1, 1, 0], same.Flags[0]);

        MemoryWriter wide = bench.Run(plan with
        {
            OutputPath = bench.Output + "2",
            Recipe = plan.Recipe with { Output = new OutputSection { Samples = SampleChoice.Float64 } },
        });
        Assert.Equal([double.PositiveInfinity, double.NegativeInfinity, double.NaN, double.NaN, 16], MemoryMarshal.Cast<byte, double>(wide.Frames[0]).ToArray());
    }

    [Fact]
    public void A_double_beyond_single_range_is_held_and_flagged_not_made_infinite()
    {
        using Bench bench = new();
        bench.Source.Add(Row(SampleType.Float64, 3), 1e300, -1e300, double.PositiveInfinity);
        RunPlan plan = bench.Plan();
        MemoryWriter written = bench.Run(plan with { Recipe = plan.Recipe with { Output = new OutputSection { Samples = SampleChoice.Float32 } } });
        Assert.Equal([float.MaxValue, float.MinValue, float.PositiveInfinity], MemoryMarshal.Cast<byte, float>(written.Frames[0]).ToArray());
        Assert.True(written.Ledger[0].Flags.HasFlag(LedgerFlags.OutOfRange));
    }

    [Fact]
    public void Saturation_is_the_bright_end_which_is_the_lower_one_of_stored_samples_under_a_negative_scale()
    {
        using Bench bench = new();
        FrameLayout layout = Row(SampleType.UInt16, 4) with { Transform = new ValueTransform(-1, 65535), SaturationStored = 1534.5 };
        bench.Source.Add<ushort>(layout, 0, 1534, 1535, 65535);
        Assert.Equal([2, 2, 0, 0], bench.Run(bench.Plan()).Flags[0]);
    }

    [Fact]
    public void A_64_bit_saturation_level_beyond_the_type_marks_nothing_and_one_at_its_end_marks_the_end()
    {
        using Bench bench = new();
        bench.Source.Add(Row(SampleType.UInt64, 2) with { SaturationStored = 1e30 }, ulong.MaxValue, 5UL);
        bench.Source.Add(Row(SampleType.UInt64, 2) with { SaturationStored = ulong.MaxValue }, ulong.MaxValue, ulong.MaxValue - 1);
        bench.Source.Add(Row(SampleType.UInt64, 2) with { SaturationStored = -4 }, ulong.MaxValue, 0UL);
        MemoryWriter written = bench.Run(bench.Plan());
        Assert.Equal([0, 0], written.Flags[0]);
        Assert.Equal([2, 0], written.Flags[1]);
        Assert.Equal([2, 2], written.Flags[2]);
    }

    [Fact]
    public void Blank_beyond_the_type_marks_nothing()
    {
        using Bench bench = new();
        bench.Source.Add<byte>(Row(SampleType.UInt8, 2) with { Blank = -1 }, 0, 255);
        bench.Source.Add<byte>(Row(SampleType.UInt8, 2) with { Blank = 255 }, 0, 255);
        MemoryWriter written = bench.Run(bench.Plan());
        Assert.Equal([0, 0], written.Flags[0]);
        Assert.Equal([0, 1], written.Flags[1]);
    }
}
