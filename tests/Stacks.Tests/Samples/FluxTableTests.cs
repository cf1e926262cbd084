using System.Globalization;
using System.Text;
using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>
/// What the bilateral filter does to the flux of faint sources, shown in README.md: a seeded field of Gaussian sources
/// (peak 10 sigma of the noise, FWHM 2.4 px) on a flat sky, range 2.5 sigmas.
/// </summary>
public class FluxTableTests
{
    private const int Side = 640, Spacing = 32;
    private const double Sky = 1000, Sigma = 10, Peak = 10 * Sigma, Fwhm = 2.4, Aperture = 5, Beyond = 13;

    private readonly List<(double X, double Y)> sources = [];
    private readonly Plane<float> clear, noisy;

    public FluxTableTests()
    {
        Random random = new(20261201);
        for (int y = Spacing / 2; y < Side; y += Spacing)
        {
            for (int x = Spacing / 2; x < Side; x += Spacing)
                sources.Add((x + random.NextDouble() - 0.5, y + random.NextDouble() - 0.5));
        }

        clear = FilterRun.PlaneOf(Side, Side, (x, y) => (float)(Sky + Peak * Light(x, y)));
        noisy = FilterRun.PlaneOf(Side, Side, (x, y) => (float)(clear[x, y] + (Sigma * Normal(random))));
    }

    [Fact]
    public void The_flux_that_sources_lose_is_measured()
    {
        StringBuilder table = new("| form | spatial sigma | flux of the source | noise |\n|---|---|---|---|");
        Dictionary<(bool, double), (double Change, double Quieter)> found = [];
        foreach (bool conserve in new[] { false, true })
        {
            foreach (double spatial in new[] { 3, 2, 1.5 })
            {
                Plane<float> smooth = FilterRun.Smooth(
                    FilterRun.Prepare(
                        new BilateralFilter(),
                        noisy,
                        ("spatial_sigma", ParameterValue.Of(spatial)),
                        ("range_sigma", ParameterValue.Of(2.5)),
                        ("conserve_flux", ParameterValue.Of(conserve))),
                    noisy,
                    noise: LinearNoise.Constant(Sigma));
                double change = sources.Average(s => Sum(smooth, s) - Sum(noisy, s)) / sources.Average(s => Sum(clear, s));
                double quieter = Deviation(noisy) / Deviation(smooth);
                found[(conserve, spatial)] = (change, quieter);
                table.Append(CultureInfo.InvariantCulture, $"\n| `conserve_flux = {(conserve ? "true" : "false")}` | {spatial} px | {100 * change:F1} % | / {quieter:F1} |");
            }
        }

        // Smoothing more takes more flux, and conserving the total keeps more of it with its source.
        foreach (bool conserve in new[] { false, true })
            Assert.True(found[(conserve, 3)].Change < found[(conserve, 2)].Change && found[(conserve, 2)].Change < found[(conserve, 1.5)].Change);
        foreach (double spatial in new[] { 3, 2, 1.5 })
            Assert.True(found[(false, spatial)].Change < found[(true, spatial)].Change);
        ReadmeBlock.AssertIs("flux", table.ToString());
    }

    private double Light(int x, int y)
    {
        // Spacing is 13 FWHM: only the nearest source is seen.
        (double sx, double sy) = sources[(y / Spacing * (Side / Spacing)) + (x / Spacing)];
        return Math.Exp(-4 * Math.Log(2) * (((x - sx) * (x - sx)) + ((y - sy) * (y - sy))) / (Fwhm * Fwhm));
    }

    private static double Sum(Plane<float> plane, (double X, double Y) source)
    {
        double sum = 0;
        for (int y = (int)(source.Y - Aperture); y <= source.Y + Aperture; y++)
        {
            for (int x = (int)(source.X - Aperture); x <= source.X + Aperture; x++)
            {
                if (((x - source.X) * (x - source.X)) + ((y - source.Y) * (y - source.Y)) <= Aperture * Aperture)
                    sum += plane[x, y] - Sky;
            }
        }

        return sum;
    }

    /// <summary>Standard deviation over pixels far from every source.</summary>
    private double Deviation(Plane<float> plane)
    {
        List<double> values = [];
        for (int y = 0; y < Side; y++)
        {
            for (int x = 0; x < Side; x++)
            {
                (double sx, double sy) = sources[(y / Spacing * (Side / Spacing)) + (x / Spacing)];
                if (Math.Max(Math.Abs(x - sx), Math.Abs(y - sy)) > Beyond)
                    values.Add(plane[x, y]);
            }
        }

        double mean = values.Average();
        return Math.Sqrt(values.Average(v => (v - mean) * (v - mean)));
    }

    /// <summary>Box and Muller, Annals of Mathematical Statistics 29 (1958) 610.</summary>
    private static double Normal(Random random) =>
        Math.Sqrt(-2 * Math.Log(1 - random.NextDouble())) * Math.Cos(2 * Math.PI * random.NextDouble());
}
