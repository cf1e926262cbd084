using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>
/// What bilateral (spatial sigma 1.5 px, flux conserved) does to night-field.fits after adaptive-median. The 5-px sums
/// are over apertures of 5 px radius.
/// </summary>
[Collection(SampleRuns.Name)]
public sealed class NightFieldSmoothTests(NightFieldRun selective, SmoothNightFieldRun smooth)
{
    private readonly Smoothing smoothing = new(selective, smooth);

    [Fact]
    public void SamplesAreThirtyTwoBitFloats() => Assert.All(smooth.After, plane => Assert.Equal(-32, plane.Bits));

    [Fact]
    public void TheTotalIsConserved()
    {
        for (int frame = 0; frame < smooth.After.Count; frame++)
            Assert.Equal(1, smooth.After[frame].Values.Sum() / selective.After[frame].Values.Sum(), 1e-9);
    }

    [Fact]
    public void NoiseInEmptyPatchesFallsToAThird()
    {
        for (int frame = 0; frame < smooth.After.Count; frame++)
        {
            (double ratio, int patches) = smoothing.NoiseRatio(frame);
            Assert.True(patches > 40, $"only {patches} empty patches in frame {frame}");
            Assert.True(ratio >= 3, $"frame {frame}: noise is {ratio:F2} times lower");
        }
    }

    [Fact]
    public void FivePixelSumsChangeByLessThanTheirNoise() => Assert.All(Smoothing.Classes, signalToNoise =>
    {
        List<double> changes = smoothing.Changes(signalToNoise);
        Assert.True(changes.Count > 100, $"only {changes.Count} stars in this class");
        Assert.True(changes.Average(Math.Abs) <= 0.7, $"mean change {changes.Average(Math.Abs):F3} sigma over {changes.Count} stars");
    });

    [Fact]
    public void AtMostFivePerCentOfSumsChangeByMoreThanTheirNoise()
    {
        List<double> changes = smoothing.Changes((0, 1000));
        int beyond = changes.Count(change => Math.Abs(change) > 1);
        Assert.True(beyond <= 0.05 * changes.Count, $"{beyond} of {changes.Count} sums changed by more than their noise");
    }
}
