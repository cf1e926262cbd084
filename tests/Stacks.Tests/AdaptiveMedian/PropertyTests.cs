using FsCheck;
using FsCheck.Xunit;
using Stacks.Abstractions;
using Xunit;

namespace Stacks.Tests.AdaptiveMedian;

/// <summary>What holds for adaptive-median on any frame.</summary>
public class PropertyTests
{
    private static readonly OracleRules Rules = new(4, 1.5, 7, 2, "both", 0);

    [Property(MaxTest = 40)]
    public void Constants_stay_constant(PositiveInt width, PositiveInt height, int seed)
    {
        int w = 1 + (width.Get % 50), h = 1 + (height.Get % 50);
        double[] frame = new double[w * h];
        Array.Fill(frame, new Random(seed).NextDouble() * 1000);
        (double[] output, SampleFlags[] flags) = Cleaning.Run(frame, new SampleFlags[w * h], w, h, LinearNoise.Constant(1e-9), Rules);
        Assert.Equal(frame, output);
        Assert.All(flags, f => Assert.Equal(SampleFlags.None, f));
    }

    [Property(MaxTest = 40)]
    public void Flips_and_transposition_commute_to_the_bit(PositiveInt width, PositiveInt height, int seed)
    {
        int w = 1 + (width.Get % 50), h = 1 + (height.Get % 50);
        (float[] frame, SampleFlags[] flags) = Frame(w, h, seed);
        (float[] output, SampleFlags[] decided) = Run(frame, flags, w, h);

        (float[] mirrored, SampleFlags[] mirroredFlags) = Run(MirrorX(frame, w, h), MirrorX(flags, w, h), w, h);
        Assert.Equal(MirrorX(output, w, h), mirrored);
        Assert.Equal(MirrorX(decided, w, h), mirroredFlags);
        (float[] transposed, SampleFlags[] transposedFlags) = Run(Transpose(frame, w, h), Transpose(flags, w, h), h, w);
        Assert.Equal(Transpose(output, w, h), transposed);
        Assert.Equal(Transpose(decided, w, h), transposedFlags);
    }

    [Property(MaxTest = 40)]
    public void Linear_changes_of_values_and_noise_commute(PositiveInt width, PositiveInt height, int seed)
    {
        // Powers of two and whole numbers keep a v + b exact, so decisions cannot differ by rounding alone.
        int w = 1 + (width.Get % 50), h = 1 + (height.Get % 50);
        Random random = new(seed);
        double a = Math.Pow(2, random.Next(-4, 5)), b = random.Next(-1000, 1000) * a;
        (float[] source, SampleFlags[] flags) = Frame(w, h, seed);
        double[] frame = [.. source.Select(v => double.IsNaN(v) ? 0 : Math.Round(v))];
        double[] changed = [.. frame.Select(v => (a * v) + b)];
        (double[] straight, SampleFlags[] decided) = Cleaning.Run(frame, flags, w, h, new LinearNoise(0.5, 4, 100), Rules);
        (double[] other, SampleFlags[] otherDecided) = Cleaning.Run(
            changed, flags, w, h, new LinearNoise(0.5 * a, 4 * a * a, (100 * a) + b), Rules);
        Assert.Equal(decided, otherDecided);
        Assert.Equal([.. straight.Select(v => (a * v) + b)], other);
    }

    [Property(MaxTest = 40)]
    public void Only_replaced_pixels_change_and_stay_in_the_range_of_the_frame(PositiveInt width, PositiveInt height, int seed)
    {
        int w = 1 + (width.Get % 50), h = 1 + (height.Get % 50);
        (float[] frame, SampleFlags[] flags) = Frame(w, h, seed);
        (float[] output, SampleFlags[] decided) = Run(frame, flags, w, h);
        float[] valid = [.. frame.Where((_, i) => (flags[i] & SampleFlags.Missing) == 0)];
        for (int i = 0; i < frame.Length; i++)
        {
            if ((decided[i] & SampleFlags.Replaced) == 0)
                Assert.Equal(BitConverter.SingleToInt32Bits(frame[i]), BitConverter.SingleToInt32Bits(output[i]));
            else
                Assert.InRange(output[i], valid.Min(), valid.Max());
            Assert.Equal(flags[i], decided[i] & ~(SampleFlags.Replaced | SampleFlags.KeptAsSource));
        }
    }

    [Property(MaxTest = 30)]
    public void Bands_give_the_same_bits(PositiveInt width, PositiveInt height, int seed)
    {
        int w = 1 + (width.Get % 90), h = 1 + (height.Get % 60);
        (float[] frame, SampleFlags[] flags) = Frame(w, h, seed);
        (float[] output, SampleFlags[] decided) = Run(frame, flags, w, h);
        foreach (int bands in new[] { 2, 5 })
        {
            (float[] other, SampleFlags[] otherDecided) = Cleaning.Run(frame, flags, w, h, new LinearNoise(0.5, 4, 100), Rules, bands);
            Assert.Equal(output, other);
            Assert.Equal(decided, otherDecided);
        }
    }

    private static (float[] Output, SampleFlags[] Flags) Run(float[] frame, SampleFlags[] flags, int width, int height) =>
        Cleaning.Run(frame, flags, width, height, new LinearNoise(0.5, 4, 100), Rules);

    private static (float[] Samples, SampleFlags[] Flags) Frame(int width, int height, int seed)
    {
        Random random = new(seed);
        float[] samples = new float[width * height];
        SampleFlags[] flags = new SampleFlags[width * height];
        double holes = random.Next(3) * 0.05;
        for (int i = 0; i < samples.Length; i++)
        {
            double ramp = (i % width) * random.Next(2) * 0.3;
            samples[i] = (float)(100 + ramp + (8 * random.NextDouble()) + (random.Next(12) == 0 ? 300 * (random.NextDouble() - 0.3) : 0));
            if (random.NextDouble() < holes)
            {
                flags[i] = SampleFlags.Missing;
                samples[i] = float.NaN;
            }
            else if (random.NextDouble() < holes / 2)
            {
                flags[i] = random.Next(2) == 0 ? SampleFlags.Saturated : SampleFlags.Defect;
            }
        }

        return (samples, flags);
    }

    private static T[] MirrorX<T>(T[] plane, int width, int height) =>
        [.. Enumerable.Range(0, width * height).Select(i => plane[((i / width) * width) + width - 1 - (i % width)])];

    private static T[] Transpose<T>(T[] plane, int width, int height) =>
        [.. Enumerable.Range(0, width * height).Select(i => plane[((i % height) * width) + (i / height)])];
}
