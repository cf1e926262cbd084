using System.Numerics;
using Stacks.Abstractions;
using Xunit;

namespace Stacks.Tests.AdaptiveMedian;

/// <summary>Every pixel and flag of adaptive-median against the oracle, on planes that are random, structured, holed and saturated.</summary>
public class OracleTests
{
    public static TheoryData<int, int> Sizes
    {
        get
        {
            TheoryData<int, int> sizes = [];
            for (int n = 1; n <= 9; n++)
                for (int m = 1; m <= 9; m++)
                    sizes.Add(n, m);
            foreach ((int w, int h) in new[] { (1, 40), (40, 1), (2, 33), (33, 2), (3, 70), (31, 16), (32, 17), (33, 12), (63, 9), (64, 9), (65, 9), (97, 40), (129, 21) })
                sizes.Add(w, h);
            return sizes;
        }
    }

    [Theory]
    [MemberData(nameof(Sizes))]
    public void Unsigned_16_bit_equals_the_oracle(int width, int height) => Compare<ushort>(width, height, 1);

    [Theory]
    [MemberData(nameof(Sizes))]
    public void Signed_16_bit_equals_the_oracle(int width, int height) => Compare<short>(width, height, 2);

    [Theory]
    [MemberData(nameof(Sizes))]
    public void Float_32_equals_the_oracle(int width, int height) => Compare<float>(width, height, 3);

    [Theory]
    [MemberData(nameof(Sizes))]
    public void Float_64_equals_the_oracle(int width, int height) => Compare<double>(width, height, 4);

    /// <summary>Squares of such values fall below or go beyond what single precision holds.</summary>
    [Theory]
    [InlineData(1e-25)]
    [InlineData(1e-23)]
    [InlineData(1e-20)]
    [InlineData(1.2e18)]
    [InlineData(1.2e19)]
    [InlineData(1e30)]
    public void Float_32_of_any_scale_equals_the_oracle(double sigma)
    {
        const int Width = 150, Height = 40;
        Random random = new(11);
        SampleFlags[] flags = new SampleFlags[Width * Height];
        float[] input = [.. flags.Select(_ => (float)(sigma * (Normal(random) + (random.Next(50) == 0 ? random.Next(-30, 30) : 0))))];
        OracleRules rules = new(5, 2, 5, 2.4, "both", 0);
        NoiseModel noise = LinearNoise.Constant(sigma);

        (float[] expected, SampleFlags[] expectedFlags) = Oracle.Run(input, flags, Width, Height, noise, rules);
        (float[] actual, SampleFlags[] actualFlags) = Cleaning.Run(input, flags, Width, Height, noise, rules, bands: 2);

        Assert.Contains(SampleFlags.ReplacedBright, expectedFlags);
        Assert.Contains(SampleFlags.ReplacedDark, expectedFlags);
        Assert.Equal(expectedFlags, actualFlags);
        Assert.Equal(expected, actual);
    }

    private static void Compare<T>(int width, int height, int seed)
        where T : unmanaged, INumber<T>
    {
        Random random = new((seed * 7919) + (width * 131) + height);
        int rounds = width * height < 100 ? 24 : 12;
        for (int round = 0; round < rounds; round++)
        {
            double q = typeof(T) == typeof(ushort) || typeof(T) == typeof(short) ? 1 : 0;
            OracleRules rules = new(
                new[] { 5, 3, 4.5 }[random.Next(3)],
                new[] { 2, 1.2 }[random.Next(2)],
                new[] { 3, 5, 7, 9, 15 }[random.Next(width * height > 500 ? 3 : 5)],
                new[] { 2.4, 0, 1.5, 4 }[random.Next(4)],
                new[] { "both", "bright", "dark" }[round % 3],
                q);
            NoiseModel noise = random.Next(2) == 0 ? new LinearNoise(0.7, 5, 200) : new UnevenNoise(0.7, 5, 200);
            (T[] input, SampleFlags[] flags) = Scene<T>(random, width, height, round);

            (T[] expected, SampleFlags[] expectedFlags) = Oracle.Run(input, flags, width, height, noise, rules);
            (T[] actual, SampleFlags[] actualFlags) = Cleaning.Run(input, flags, width, height, noise, rules, bands: 1 + (round % 3));

            for (int i = 0; i < input.Length; i++)
            {
                Assert.True(
                    expected[i].Equals(actual[i]) && expectedFlags[i] == actualFlags[i],
                    $"{width} x {height} round {round} {rules}, ({i % width}, {i / width}): {input[i]} {flags[i]} -> {actual[i]} {actualFlags[i]}, expected {expected[i]} {expectedFlags[i]}");
            }
        }
    }

    /// <summary>Sky, stars, an edge, hits of both signs, in some rounds holes, saturation and defects.</summary>
    private static (T[] Samples, SampleFlags[] Flags) Scene<T>(Random random, int width, int height, int round)
        where T : unmanaged, INumber<T>
    {
        T[] samples = new T[width * height];
        SampleFlags[] flags = new SampleFlags[width * height];
        double missing = (round % 4) switch { 1 => 0.05, 2 => 0.5, _ => 0 };
        double hits = new[] { 0.01, 0.1, 0.3 }[round % 3];
        double starX = random.NextDouble() * width, starY = random.NextDouble() * height, edge = random.NextDouble() * width;
        for (int y = 0; y < height; y++)
        {
            for (int x = 0; x < width; x++)
            {
                double distance = ((x - starX) * (x - starX)) + ((y - starY) * (y - starY));
                double light = 260 + (2000 * Math.Exp(-distance / 2.1)) + (round % 5 == 0 && x > edge ? 300 : 0);
                double v = light + (Math.Sqrt(0.7 * light) * Normal(random));
                if (random.NextDouble() < hits)
                    v += random.Next(4) == 0 ? -200 * random.NextDouble() : 600 * random.NextDouble();
                int i = (y * width) + x;
                if (random.NextDouble() < missing)
                    flags[i] |= SampleFlags.Missing;
                if (round % 3 == 1 && v > 900)
                    flags[i] |= SampleFlags.Saturated;
                if (round % 4 == 3 && random.NextDouble() < 0.05)
                    flags[i] |= SampleFlags.Defect;
                samples[i] = typeof(T) == typeof(float) || typeof(T) == typeof(double)
                    ? (flags[i] & SampleFlags.Missing) != 0 ? T.CreateTruncating(double.NaN) : T.CreateTruncating(v - 230)
                    : T.CreateSaturating(Math.Round(v));
            }
        }

        return (samples, flags);
    }

    private static double Normal(Random random) =>
        Math.Sqrt(-2 * Math.Log(1 - random.NextDouble())) * Math.Cos(2 * Math.PI * random.NextDouble());
}
