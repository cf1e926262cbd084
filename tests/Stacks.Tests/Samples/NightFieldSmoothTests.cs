using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>
/// What bilateral (spatial sigma 1.5 px, flux conserved) does to night-field.fits after adaptive-median, against the
/// output of adaptive-median alone and against the noise the generator drew by.
/// </summary>
public sealed class NightFieldSmoothTests(NightFieldTests.Run selective, NightFieldSmoothTests.Run smooth)
    : IClassFixture<NightFieldTests.Run>, IClassFixture<NightFieldSmoothTests.Run>
{
    private const double Gain = 1.46, ReadNoise = 3.2, Pedestal = 200;

    public sealed class Run() : SampleRun("night-field-smooth.recipe.toml", "night-field.fits", "night-field.impulses.tsv");

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
            List<(int X, int Y)> patches = EmptyPatches(frame);
            Assert.True(patches.Count > 40, $"only {patches.Count} empty patches in frame {frame}");
            double before = Deviation(selective.After[frame], patches), after = Deviation(smooth.After[frame], patches);
            Assert.True(before >= 3 * after, $"frame {frame}: noise {before:F2} ADU before, {after:F2} ADU after");
        }
    }

    [Theory]
    [InlineData(0, 10)]
    [InlineData(10, 30)]
    [InlineData(30, 100)]
    [InlineData(100, 1000)]
    public void FivePixelSumsChangeByLessThanTheirNoise(double from, double to)
    {
        List<double> changes = [];
        foreach (PlantedSource star in MeasurableStars())
        {
            double noise = SumNoise(star);
            double signalToNoise = star.Flux / Gain / noise;
            if (signalToNoise >= from && signalToNoise < to)
                changes.Add(Change(star) / noise);
        }

        Assert.True(changes.Count > 100, $"only {changes.Count} stars in this class");
        Assert.True(changes.Average(Math.Abs) <= 0.7, $"mean change {changes.Average(Math.Abs):F3} sigma over {changes.Count} stars");
    }

    [Fact]
    public void AtMostFivePerCentOfSumsChangeByMoreThanTheirNoise()
    {
        List<PlantedSource> stars = [.. MeasurableStars()];
        int beyond = stars.Count(star => Math.Abs(Change(star)) > SumNoise(star));
        Assert.True(beyond <= 0.05 * stars.Count, $"{beyond} of {stars.Count} sums changed by more than their noise");
    }

    // Stars without hits and without saturated pixels in their apertures.
    private IEnumerable<PlantedSource> MeasurableStars() => selective.Stars.Where(star =>
        selective.IsWholeAndClean(star) && SampleRun.Aperture(star).All(p => selective.Before[star.Frame][p.X, p.Y] < 65535));

    private double Change(PlantedSource star) =>
        SampleRun.FivePixelSum(smooth.After[star.Frame], star) - SampleRun.FivePixelSum(selective.After[star.Frame], star);

    // The sum's own noise by the model: sigma^2 = (v - pedestal) / gain + (read noise / gain)^2 + 1/12 for each pixel.
    private double SumNoise(PlantedSource star) => Math.Sqrt(SampleRun.Aperture(star).Sum(p =>
        (Math.Max(selective.Before[star.Frame][p.X, p.Y] - Pedestal, 0) / Gain) + Math.Pow(ReadNoise / Gain, 2) + (1.0 / 12)));

    // Corners of squares of 10 px that no star reaches within 16 px and no hit within 8 px.
    private List<(int X, int Y)> EmptyPatches(int frame)
    {
        List<(int, int)> patches = [];
        for (int y = 0; y + 10 <= 400; y += 10)
        {
            for (int x = 0; x + 10 <= 400; x += 10)
            {
                bool starNear = selective.Stars.Any(s => s.Frame == frame && s.X > x - 16 && s.X < x + 26 && s.Y > y - 16 && s.Y < y + 26);
                bool hitNear = selective.Struck[frame].Any(p => p.X > x - 8 && p.X < x + 18 && p.Y > y - 8 && p.Y < y + 18);
                if (!starNear && !hitNear)
                    patches.Add((x, y));
            }
        }

        return patches;
    }

    // About one mean for all patches of the frame: the sky is flat, so that slow waves count as noise too.
    private static double Deviation(PlainPlane plane, List<(int X, int Y)> patches)
    {
        double[] values = [.. from patch in patches from y in Enumerable.Range(patch.Y, 10) from x in Enumerable.Range(patch.X, 10) select plane[x, y]];
        double mean = values.Average();
        return Math.Sqrt(values.Average(v => (v - mean) * (v - mean)));
    }
}
