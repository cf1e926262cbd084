using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>
/// What adaptive-median does to night-field.fits, against the truth its generator wrote. The rates are those the
/// project promises for simulated fields of this kind; a replaced pixel is one whose output differs from its input.
/// </summary>
[Collection(SampleRuns.Name)]
public sealed class NightFieldTests(NightFieldRun run)
{
    private const double Saturation = 65535;

    [Theory]
    [InlineData("isolated", 0.99, 800)]
    [InlineData("track", 0.99, 1500)]
    [InlineData("path-track", 0.90, 2000)]
    [InlineData("block", 0.85, 700)]
    [InlineData("hot", 0.99, 800)]
    public void HitsOnTheBackgroundAreRemoved(string kind, double rate, int count) =>
        run.AssertRate(rate, count, p => p.Kind == kind && !p.OnSource && p.IsAboveTenSigma);

    [Fact]
    public void HitsOnStarLightThatOutshineTheStarAreRemoved() =>
        run.AssertRate(0.90, 200, p => p.OnSource && p.Height > p.SourcePeak && p.IsAboveTenSigma && !IsSaturated(p));

    [Fact]
    public void ReplacedHitsTakeTheLevelOfTheirSurroundings()
    {
        double[] errors =
        [
            .. from p in run.Planted
               where !p.OnSource && p.IsAboveTenSigma && run.IsReplaced(p.Frame, p.X, p.Y)
               select (run.After[p.Frame][p.X, p.Y] - (run.Before[p.Frame][p.X, p.Y] - p.Height)) / p.LocalSigma,
        ];
        // What stood under a hit is known up to its own noise of 1 sigma and that of the replacement.
        Assert.InRange(errors.Average(), -0.1, 0.1);
        Assert.InRange(Math.Sqrt(errors.Average(e => e * e)), 0.9, 1.4);
    }

    [Fact]
    public void CleanPixelsStay()
    {
        (List<(int, int, int)> replaced, long clean) = run.CleanPixels();
        Assert.True(replaced.Count <= 2e-5 * clean, $"{replaced.Count} of {clean} clean pixels were replaced");
    }

    [Fact]
    public void NoPixelOfAStarsCoreIsLost()
    {
        List<(PlantedSource, int, int)> lost =
        [
            .. from star in run.Stars
               where star.Column is >= 0 and < 400 && star.Row is >= 0 and < 400
               from p in SampleRun.Core(star)
               where p.X is >= 0 and < 400 && p.Y is >= 0 and < 400
               where !run.Struck[star.Frame].Contains(p) && run.IsReplaced(star.Frame, p.X, p.Y)
               select (star, p.X, p.Y),
        ];
        Assert.Empty(lost);
    }

    [Fact]
    public void FivePixelSumsOfStarsWithoutHitsAreEqualToTheBit()
    {
        List<PlantedSource> clean = [.. run.Stars.Where(s => run.IsWholeAndClean(s))];
        Assert.True(clean.Count > 1000, $"only {clean.Count} stars without hits");
        Assert.All(clean, star =>
            Assert.Equal(SampleRun.Sum(run.Before[star.Frame], star), SampleRun.Sum(run.After[star.Frame], star)));
    }

    [Fact]
    public void SaturatedPixelsAreUntouched()
    {
        int saturated = 0;
        foreach ((PlainPlane before, PlainPlane after) in run.Before.Zip(run.After))
        {
            foreach ((double was, double now) in before.Values.Zip(after.Values).Where(v => v.First >= Saturation))
            {
                Assert.Equal(was, now);
                saturated++;
            }
        }

        Assert.True(saturated > 300, $"only {saturated} saturated pixels");
    }

    [Fact]
    public void SamplesStaySixteenBit() => Assert.All(run.After, plane => Assert.Equal(16, plane.Bits));

    private bool IsSaturated(PlantedPixel p) => run.Before[p.Frame][p.X, p.Y] >= Saturation;
}
