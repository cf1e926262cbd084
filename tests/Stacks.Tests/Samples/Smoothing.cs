namespace Stacks.Tests.Samples;

/// <summary>What smoothing changes in the night field: the output of both steps against that of adaptive-median alone.</summary>
internal sealed class Smoothing(NightFieldRun selective, SmoothNightFieldRun smooth)
{
    private const double Gain = 1.46, ReadNoise = 3.2, Pedestal = 200, Saturation = 65535;
    private const int PatchSide = 10;

    /// <summary>The classes of signal to noise in the aperture that figures are stated for.</summary>
    public static (double From, double To)[] Classes { get; } = [(0, 10), (10, 30), (30, 100), (100, 1000)];

    /// <summary>Changes of aperture sums in units of their own noise, for stars of a class without hits and saturated pixels.</summary>
    public List<double> Changes((double From, double To) signalToNoise, double radius = 5) =>
    [
        .. from star in selective.Stars
           where selective.IsWholeAndClean(star) && SampleRun.Aperture(star).All(p => selective.Before[star.Frame][p.X, p.Y] < Saturation)
           let ratio = star.Flux / Gain / Noise(star, 5)
           where ratio >= signalToNoise.From && ratio < signalToNoise.To
           select (SampleRun.Sum(smooth.After[star.Frame], star, radius) - SampleRun.Sum(selective.After[star.Frame], star, radius)) / Noise(star, radius),
    ];

    /// <summary>How many times lower the noise of a frame's empty patches is, and how many patches there are.</summary>
    public (double Ratio, int Patches) NoiseRatio(int frame)
    {
        List<(int X, int Y)> patches = EmptyPatches(frame);
        return (Deviation(selective.After[frame], patches) / Deviation(smooth.After[frame], patches), patches.Count);
    }

    // A sum's own noise by the model: sigma^2 = (v - pedestal) / gain + (read noise / gain)^2 + 1/12 for each pixel.
    private double Noise(PlantedSource star, double radius) => Math.Sqrt(SampleRun.Aperture(star, radius).Sum(p =>
        (Math.Max(selective.Before[star.Frame][p.X, p.Y] - Pedestal, 0) / Gain) + Math.Pow(ReadNoise / Gain, 2) + (1.0 / 12)));

    // Corners of squares that no star reaches within 16 px and no hit within 8 px.
    private List<(int X, int Y)> EmptyPatches(int frame)
    {
        List<(int, int)> patches = [];
        for (int y = 0; y + PatchSide <= 400; y += PatchSide)
        {
            for (int x = 0; x + PatchSide <= 400; x += PatchSide)
            {
                bool IsNear(double px, double py, int distance) =>
                    px > x - distance && px < x + PatchSide + distance && py > y - distance && py < y + PatchSide + distance;
                if (!selective.Stars.Any(s => s.Frame == frame && IsNear(s.X, s.Y, 16)) && !selective.Struck[frame].Any(p => IsNear(p.X, p.Y, 8)))
                    patches.Add((x, y));
            }
        }

        return patches;
    }

    // About one mean for all patches of the frame: the sky is flat, so that slow waves count as noise too.
    private static double Deviation(PlainPlane plane, List<(int X, int Y)> patches)
    {
        double[] values =
        [
            .. from patch in patches
               from y in Enumerable.Range(patch.Y, PatchSide)
               from x in Enumerable.Range(patch.X, PatchSide)
               select plane[x, y],
        ];
        double mean = values.Average();
        return Math.Sqrt(values.Average(v => (v - mean) * (v - mean)));
    }
}
