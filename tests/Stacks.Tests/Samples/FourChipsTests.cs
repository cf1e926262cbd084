using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>What adaptive-median does to four-chips.fits, each extension by the noise of its own header, against the truth.</summary>
[Collection(SampleRuns.Name)]
public sealed class FourChipsTests(FourChipsRun run)
{
    [Theory]
    [InlineData("isolated", 0.99, 300)]
    [InlineData("track", 0.99, 600)]
    [InlineData("block", 0.95, 200)]
    public void HitsOnTheBackgroundAreRemoved(string kind, double rate, int count) =>
        run.AssertRate(rate, count, p => p.Kind == kind && !p.OnSource && p.IsAboveTenSigma);

    [Fact]
    public void HitsOnStarLightThatOutshineTheStarAreRemoved() =>
        run.AssertRate(0.90, 30, p => p.OnSource && p.Height > p.SourcePeak && p.IsAboveTenSigma);

    [Fact]
    public void CleanPixelsStay()
    {
        (List<(int, int, int)> replaced, long clean) = run.CleanPixels();
        Assert.True(replaced.Count <= 2e-5 * clean, $"{replaced.Count} of {clean} clean pixels were replaced");
    }

    [Fact]
    public void DeadPixelsStayDead()
    {
        int dead = 0;
        foreach ((PlainPlane before, PlainPlane after) in run.Before.Zip(run.After))
        {
            Assert.Equal(before.Values.Select(double.IsNaN), after.Values.Select(double.IsNaN));
            dead += before.Values.Count(double.IsNaN);
        }

        Assert.True(dead > 600, $"only {dead} dead pixels");
    }

    [Fact]
    public void EveryExtensionIsThere() =>
        Assert.Equal(["SCI", "SCI", "SCI", "SCI"], run.After.Select(plane => plane.Name));
}
