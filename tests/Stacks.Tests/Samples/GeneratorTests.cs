using Stacks.SampleStacks;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Samples;

public sealed class GeneratorTests
{
    [Fact]
    public void EveryFileIsReproducedByteForByte()
    {
        using TemporaryFolder folder = new();
        SampleStacks.Samples.WriteAll(folder.Path);
        string[] made = [.. Directory.GetFiles(folder.Path).Select(f => Path.GetFileName(f)).Order()];
        string[] committed = [.. Directory.GetFiles(Truth.Path(""))
            .Select(f => Path.GetFileName(f)).Where(f => !f.EndsWith(".toml", StringComparison.Ordinal) && f != "README.md").Order()];
        Assert.Equal(committed, made);
        Assert.All(made, name => Assert.True(
            File.ReadAllBytes(folder.File(name)).AsSpan().SequenceEqual(File.ReadAllBytes(Truth.Path(name))), $"{name} differs"));
    }

    [Fact]
    public void AllOfItIsUnderTwelveMegabytes() =>
        Assert.InRange(Directory.GetFiles(Truth.Path("")).Sum(f => new FileInfo(f).Length), 1, 12_000_000);

    // State 1, 2, 3, 4: the first outputs follow by hand from the authors' code: rotl(2 * 5, 7) * 9 = 11520, then s1 = 0.
    // All ten are those of the Rust rand_xoshiro crate's own reference test.
    [Fact]
    public void GeneratorGivesThePublishedStream()
    {
        RandomSource random = new(1, 2, 3, 4);
        ulong[] expected =
        [
            11520, 0, 1509978240, 1215971899390074240, 1216172134540287360,
            607988272756665600, 16172922978634559625, 8476171486693032832, 10595114339597558777, 2904607092377533576,
        ];
        Assert.Equal(expected, expected.Select(_ => random.Bits()));
    }

    // Against the platform's own functions, and erf against Abramowitz and Stegun, table 7.1.
    [Fact]
    public void ElementaryFunctionsAreAccurate()
    {
        for (double x = -30; x < 30; x += 0.0137)
        {
            Assert.Equal(1, Elementary.Exp(x) / Math.Exp(x), 1e-14);
            Assert.Equal(x, Elementary.Log(Math.Exp(x)), 1e-13);
        }

        Assert.Equal(0.5204998778, Elementary.Erf(0.5), 1e-10);
        Assert.Equal(0.8427007929, Elementary.Erf(1.0), 1e-10);
        Assert.Equal(0.9953222650, Elementary.Erf(2.0), 1e-10);
        Assert.Equal(-0.8427007929, Elementary.Erf(-1.0), 1e-10);
        double sum = 0;
        for (int k = 1; k < 60; k++)
            Assert.Equal(sum += Math.Log(k), Elementary.LogFactorial(k), 1e-12 * Math.Max(sum, 1));
    }

    // Chi-square of 400,000 draws against the Poisson probabilities e^-m m^k / k!; the bound is 6 sigma of chi-square.
    [Theory]
    [InlineData(3.5)]
    [InlineData(11.9)]
    [InlineData(12.1)]
    [InlineData(40)]
    [InlineData(900)]
    public void PoissonDrawsFollowTheirProbabilities(double mean)
    {
        const int Draws = 400_000;
        RandomSource random = new(5);
        Dictionary<double, int> counts = [];
        for (int i = 0; i < Draws; i++)
        {
            double k = random.Poisson(mean);
            counts[k] = counts.GetValueOrDefault(k) + 1;
        }

        double logFactorial = 0, chiSquare = 0;
        int cells = 0;
        for (int k = 0; k < 2000; k++)
        {
            logFactorial += k == 0 ? 0 : Math.Log(k);
            double expected = Draws * Math.Exp((k * Math.Log(mean)) - mean - logFactorial);
            if (expected < 20)
                continue;
            chiSquare += Math.Pow(counts.GetValueOrDefault(k) - expected, 2) / expected;
            cells++;
        }

        Assert.InRange(chiSquare, cells - (6 * Math.Sqrt(2 * cells)), cells + (6 * Math.Sqrt(2 * cells)));
    }

    [Fact]
    public void NormalDrawsHaveUnitVarianceAndNormalTails()
    {
        RandomSource random = new(6);
        double[] draws = [.. Enumerable.Range(0, 400_000).Select(_ => random.Normal())];
        Assert.Equal(0, draws.Average(), 0.01);
        Assert.Equal(1, draws.Average(x => x * x), 0.012);
        // P(|x| > 2) = 0.0455003 (Abramowitz and Stegun, table 26.1).
        Assert.Equal(0.0455, draws.Count(x => Math.Abs(x) > 2) / 400_000.0, 0.002);
    }

    // A Gaussian of FWHM 2 px falls to half at 1 px: narrow pixels would see 1 : 0.5; the integrals follow from erf tables.
    [Fact]
    public void PointSourceIsIntegratedOverPixels()
    {
        Light light = new(31, 31);
        light.AddPointSource(1000, 15, 15, 2.3548200450309493);
        // sigma = 1: share of the middle pixel = erf(0.5 / sqrt 2)^2 = 0.3829249225^2 (table 26.1).
        Assert.Equal(1000 * 0.3829249225 * 0.3829249225, light[15, 15], 1e-6);
        Assert.Equal(1000, light.Electrons.Sum(), 1e-9);
    }
}
