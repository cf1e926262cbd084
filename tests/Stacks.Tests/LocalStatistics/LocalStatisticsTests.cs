using System.Globalization;
using FsCheck;
using FsCheck.Xunit;
using Stacks.Abstractions;
using Stacks.Filters.LocalStatistics;
using Stacks.Imaging;
using Stacks.Tests.Means;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.LocalStatistics;

/// <summary>Lee's filter and its robust form against their formulas; local moments against certified values.</summary>
public class LocalStatisticsTests
{
    private static readonly LinearNoise Camera = new(0.5, 400, 20);

    private static (string, ParameterValue)[] Given(int side, string form) => [("window", ParameterValue.Of(side)), ("form", ParameterValue.Of(form))];

    [Property(MaxTest = 40)]
    public void The_mean_form_is_its_formula(PositiveInt width, PositiveInt height, int seed)
    {
        SmoothingScene scene = new(1 + (width.Get % 20), 1 + (height.Get % 20), seed, missing: 0.1, saturated: 0.1);
        Compare(scene, 5, "mean", (x, y) =>
        {
            double[] v = scene.Sound(x, y, 5);
            double mean = v.Average();
            return (v.Length, mean, v.Sum(s => (s - mean) * (s - mean)) / (v.Length - 1));
        });
    }

    /// <summary>Full windows, so that c(k) is the constant of the table: 9 and 25 samples, 1.143942 (2 x 0.57197, Harter, Biometrika 48 (1961) 151) and 1.273807.</summary>
    [Property(MaxTest = 40)]
    public void The_robust_form_is_its_formula(PositiveInt width, PositiveInt height, int seed)
    {
        SmoothingScene scene = new(1 + (width.Get % 20), 1 + (height.Get % 20), seed);
        foreach ((int side, double c) in new[] { (3, 1.143942), (5, 1.273807) })
        {
            Compare(
                scene,
                side,
                "robust",
                (x, y) =>
                {
                    double[] v = [.. scene.Sound(x, y, side).Order()];
                    double iqr = v[v.Length - 1 - ((v.Length - 1) / 4)] - v[(v.Length - 1) / 4];
                    return (v.Length, v[v.Length / 2], iqr / c * (iqr / c));
                },
                tolerance: 1e-3);
        }
    }

    [Fact]
    public void Noise_above_the_local_variance_gives_the_local_mean_and_no_variance_leaves_the_value()
    {
        SmoothingScene scene = new(9, 9, 3);
        Plane<double> smooth = FilterRun.Smooth(
            FilterRun.Prepare(new LocalStatisticsFilter(), scene.Plane, Given(3, "mean")), scene.Plane, scene.Flags, LinearNoise.Constant(1e6));
        Assert.Equal(scene.Sound(4, 4, 3).Average(), smooth[4, 4], 1e-9);
        Plane<double> flat = FilterRun.PlaneOf(9, 9, (_, _) => 1234.567);
        foreach (string form in new[] { "mean", "robust" })
        {
            Plane<double> same = FilterRun.Smooth(FilterRun.Prepare(new LocalStatisticsFilter(), flat, Given(7, form)), flat, noise: Camera);
            Assert.All(same.Samples.ToArray(), v => Assert.Equal(1234.567, v));
        }
    }

    [Property(MaxTest = 20)]
    public void It_is_affine_and_bands_do_not_change_a_bit(int seed)
    {
        SmoothingScene scene = new(23, 31, seed, missing: 0.05, saturated: 0.05);
        Plane<double> changed = FilterRun.PlaneOf(23, 31, (x, y) => (2 * scene.Plane[x, y]) + 100);
        LinearNoise doubled = new(2 * Camera.Slope, 4 * Camera.Floor, (2 * Camera.Pedestal) + 100);
        foreach (string form in new[] { "mean", "robust" })
        {
            IFilterStep<double> step = FilterRun.Prepare(new LocalStatisticsFilter(), scene.Plane, Given(5, form));
            Plane<double> straight = FilterRun.Smooth(step, scene.Plane, scene.Flags, Camera);
            Plane<double> result = FilterRun.Smooth(step, changed, scene.Flags, doubled);
            for (int i = 0; i < result.Length; i++)
                Assert.Equal((2 * straight.Samples[i]) + 100, result.Samples[i], 1e-9);
            foreach (int bands in new[] { 2, 5 })
                Assert.Equal(straight.Samples.ToArray(), FilterRun.Smooth(step, scene.Plane, scene.Flags, Camera, bands).Samples.ToArray());
        }
    }

    /// <summary>
    /// NIST Statistical Reference Datasets, univariate: certified mean and standard deviation (divisor n - 1), to 8
    /// digits, at every vector width; a naive sum of squares gives 0 for NumAcc4.
    /// </summary>
    [NeedsTheory(Needs.RealDataNeed)]
    [InlineData("NumAcc1", 10000002, 1)]
    [InlineData("NumAcc2", 1.2, 0.1)]
    [InlineData("NumAcc3", 1000000.2, 0.1)]
    [InlineData("NumAcc4", 10000000.2, 0.1)]
    public void Local_mean_and_variance_have_8_digits_of_the_certified_values(string name, double mean, double deviation)
    {
        const int side = 33;
        double[] series = Series(name);

        // The series starts at the centre, whose window is the plane.
        int Place(int x, int y) => ((y * side) + x + ((side * side) - (side * side / 2))) % (side * side);
        Plane<double> values = FilterRun.PlaneOf(side, side, (x, y) => Place(x, y) < series.Length ? series[Place(x, y)] : double.NaN);
        Plane<SampleFlags> flags = FilterRun.PlaneOf(side, side, (x, y) => Place(x, y) < series.Length ? SampleFlags.None : SampleFlags.Missing);
        foreach (int lanes in new[] { 1, 2, 4, 8 })
        {
            new WindowMoments<double>(values, flags, SampleFlags.Missing, side, new Scratch()) { Lanes = lanes }.Rows(side / 2, (side / 2) + 1, (_, _, means, squares, counts) =>
            {
                Assert.Equal(series.Length, counts[side / 2]);
                Assert.Equal(1, means[side / 2] / mean, 1e-8);
                Assert.Equal(1, Math.Sqrt(squares[side / 2] / (series.Length - 1)) / deviation, 1e-8);
            });
        }
    }

    private static double[] Series(string name) =>
    [
        .. File.ReadLines(RealData.File("nist", name + ".dat"))
            .SkipWhile(line => !line.StartsWith("----", StringComparison.Ordinal))
            .Skip(1)
            .Where(line => line.Trim().Length > 0)
            .Select(line => double.Parse(line, CultureInfo.InvariantCulture)),
    ];

    private static void Compare(SmoothingScene scene, int side, string form, Func<int, int, (int Count, double Centre, double Variance)> local, double tolerance = 1e-9)
    {
        Plane<double> result = FilterRun.Smooth(
            FilterRun.Prepare(new LocalStatisticsFilter(), scene.Plane, Given(side, form)), scene.Plane, scene.Flags, Camera);
        for (int y = 0; y < result.Height; y++)
        {
            for (int x = 0; x < result.Width; x++)
            {
                double v = scene.Plane[x, y], expected = v;
                if (scene.Flags[x, y] == SampleFlags.None && local(x, y) is { Count: >= 3, Variance: > 0 } found)
                    expected = v - (Math.Min(1, Camera.Variance(x, y, found.Centre) / found.Variance) * (v - found.Centre));
                Assert.Equal(expected, result[x, y], tolerance);
            }
        }
    }
}
