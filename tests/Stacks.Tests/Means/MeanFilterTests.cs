using FsCheck;
using FsCheck.Xunit;
using Stacks.Abstractions;
using Stacks.Filters.Means;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Means;

/// <summary>The textbook means against their definitions, written down sample by sample.</summary>
public class MeanFilterTests
{
    private const int Side = 5;
    private static readonly double[] Weights = [.. Enumerable.Range(0, Side * Side).Select(i => 1.0 + (i % 7))];

    private static readonly (MeanFilter Filter, (string, ParameterValue)[] Given, Func<double[], double> Definition)[] OverSets =
    [
        (new ArithmeticMeanFilter(), [Window], v => v.Average()),
        (new GeometricMeanFilter(), [Window, Pedestal(20)], v => Math.Exp(v.Average(x => Math.Log(x + 20))) - 20),
        (new HarmonicMeanFilter(), [Window], v => v.Length / v.Sum(x => 1 / x)),
        (new ContraharmonicMeanFilter(), [Window, Order(1.5)], v => v.Sum(x => Math.Pow(x, 2.5)) / v.Sum(x => Math.Pow(x, 1.5))),
        (new ContraharmonicMeanFilter(), [Window, Order(-2), Pedestal(-10)], v => (v.Sum(x => Math.Pow(x - 10, -1)) / v.Sum(x => Math.Pow(x - 10, -2))) + 10),
    ];

    private static (string, ParameterValue) Window => ("window", ParameterValue.Of(Side));

    private static (string, ParameterValue) Order(double order) => ("order", ParameterValue.Of(order));

    private static (string, ParameterValue) Pedestal(double pedestal) => ("pedestal", ParameterValue.Of(pedestal));

    [Property(MaxTest = 40)]
    public void Every_mean_is_its_definition_over_sound_samples(PositiveInt width, PositiveInt height, int seed)
    {
        SmoothingScene scene = new(1 + (width.Get % 20), 1 + (height.Get % 20), seed, missing: 0.1, saturated: 0.1);
        foreach ((MeanFilter filter, (string, ParameterValue)[] given, Func<double[], double> definition) in OverSets)
        {
            Plane<double> result = FilterRun.Smooth(FilterRun.Prepare(filter, scene.Plane, given), scene.Plane, scene.Flags);
            Each(scene, result, (x, y) => definition(scene.Sound(x, y, Side)));
        }
    }

    [Property(MaxTest = 40)]
    public void Weighted_and_gaussian_means_are_normalised_sums(PositiveInt width, PositiveInt height, int seed)
    {
        SmoothingScene scene = new(1 + (width.Get % 20), 1 + (height.Get % 20), seed, missing: 0.1, saturated: 0.1);
        double Weighted(int x, int y, int side, Func<int, double> weight)
        {
            var sound = scene.Window(x, y, side).Where(w => w.Flags == SampleFlags.None).ToArray();
            return sound.Sum(w => weight(w.Place) * w.Value) / sound.Sum(w => weight(w.Place));
        }

        Plane<double> weighted = FilterRun.Smooth(
            FilterRun.Prepare(new WeightedMeanFilter(), scene.Plane, ("weights", ParameterValue.Of(Weights))), scene.Plane, scene.Flags);
        Each(scene, weighted, (x, y) => Weighted(x, y, Side, place => Weights[place]));

        // The oracle sums to 7 sigma; what a Gaussian cut at 4 sigma leaves out is below 1e-3 of the scene's range of 200.
        const int far = 15;
        Plane<double> gaussian = FilterRun.Smooth(FilterRun.Prepare(new GaussianFilter(), scene.Plane, ("sigma", ParameterValue.Of(1))), scene.Plane, scene.Flags);
        Each(
            scene,
            gaussian,
            (x, y) => Weighted(x, y, far, place => Math.Exp(-(Math.Pow((place % far) - 7, 2) + Math.Pow((place / far) - 7, 2)) / 2)),
            tolerance: 0.2);
    }

    /// <summary>
    /// 1, 2, 4 around 8: by hand, over 1, 2, 4 and 8: arithmetic 15/4, geometric (1*2*4*8)^(1/4) = 2^1.5, harmonic
    /// 4/(1 + 1/2 + 1/4 + 1/8) = 32/15, contraharmonic of order 1 (1 + 4 + 16 + 64)/15 = 17/3.
    /// </summary>
    [Fact]
    public void Worked_values()
    {
        // A window of 3 x 3 on 2 x 2 samples: reflection repeats them 1, 2, 2 and 4 times, so weights would differ; missing
        // samples around 2 x 2 make the window hold each once.
        Plane<double> plane = FilterRun.PlaneOf(4, 4, (x, y) => (x, y) switch { (1, 1) => 8, (2, 1) => 1, (1, 2) => 2, (2, 2) => 4, _ => double.NaN });
        Plane<SampleFlags> flags = FilterRun.PlaneOf(4, 4, (x, y) => x is 1 or 2 && y is 1 or 2 ? SampleFlags.None : SampleFlags.Missing);
        double At(MeanFilter filter, params (string, ParameterValue)[] given) => FilterRun.Smooth(FilterRun.Prepare(filter, plane, given), plane, flags)[1, 1];
        Assert.Equal(3.75, At(new ArithmeticMeanFilter()), 12);
        Assert.Equal(Math.Sqrt(8), At(new GeometricMeanFilter()), 12);
        Assert.Equal(32.0 / 15, At(new HarmonicMeanFilter()), 12);
        Assert.Equal(17.0 / 3, At(new ContraharmonicMeanFilter(), Order(1)), 12);
    }

    [Theory]
    [InlineData(0)]
    [InlineData(-3.5)]
    public void Values_that_have_no_such_mean_are_refused_with_their_place(double value)
    {
        Plane<double> plane = FilterRun.PlaneOf(4, 3, (x, y) => (x, y) == (2, 1) ? value : 5.0);
        foreach (MeanFilter filter in new MeanFilter[] { new GeometricMeanFilter(), new HarmonicMeanFilter() })
        {
            StackFormatException error = Assert.Throws<StackFormatException>(() => FilterRun.Smooth(FilterRun.Prepare(filter, plane), plane));
            Assert.Contains("frame 0, pixel (2, 1)", error.Message, StringComparison.Ordinal);
            Assert.Contains("pedestal", error.Message, StringComparison.Ordinal);
            Assert.Equal(65, error.ExitCode);
            FilterRun.Smooth(FilterRun.Prepare(filter, plane, Pedestal(4)), plane);
        }
    }

    [Property(MaxTest = 30)]
    public void Constants_stay_constant_to_the_bit(PositiveInt width, PositiveInt height, int seed)
    {
        double level = 1 + (1000 * new Random(seed).NextDouble());
        Plane<double> plane = FilterRun.PlaneOf(1 + (width.Get % 20), 1 + (height.Get % 20), (_, _) => level);
        foreach ((MeanFilter filter, (string, ParameterValue)[] given, _) in OverSets)
            Assert.All(FilterRun.Smooth(FilterRun.Prepare(filter, plane, given), plane).Samples.ToArray(), v => Assert.Equal(level, v));
    }

    [Property(MaxTest = 30)]
    public void Doubling_the_values_doubles_the_result_and_a_shift_shifts_affine_ones(int seed)
    {
        SmoothingScene scene = new(17, 11, seed, missing: 0.1);
        foreach ((MeanFilter filter, (string Name, ParameterValue)[] given, _) in OverSets.Where(c => c.Given.All(g => g.Item1 != "pedestal")))
        {
            double shift = filter.Equivariance == Equivariance.Affine ? 300 : 0;
            Plane<double> changed = FilterRun.PlaneOf(17, 11, (x, y) => (2 * scene.Plane[x, y]) + shift);
            Plane<double> straight = FilterRun.Smooth(FilterRun.Prepare(filter, scene.Plane, given), scene.Plane, scene.Flags);
            Plane<double> result = FilterRun.Smooth(FilterRun.Prepare(filter, changed, given), changed, scene.Flags);
            for (int i = 0; i < result.Length; i++)
                Assert.Equal((2 * straight.Samples[i]) + shift, result.Samples[i], 1e-9);
        }
    }

    [Property(MaxTest = 20)]
    public void Bands_do_not_change_a_bit(PositiveInt width, PositiveInt height, int seed)
    {
        SmoothingScene scene = new(1 + (width.Get % 40), 1 + (height.Get % 40), seed, missing: 0.05, saturated: 0.05);
        foreach ((MeanFilter filter, (string, ParameterValue)[] given, _) in OverSets)
        {
            IFilterStep<double> step = FilterRun.Prepare(filter, scene.Plane, given);
            long[] one = Bits(FilterRun.Smooth(step, scene.Plane, scene.Flags));
            foreach (int bands in new[] { 2, 5 })
                Assert.Equal(one, Bits(FilterRun.Smooth(step, scene.Plane, scene.Flags, bands: bands)));
        }
    }

    private static long[] Bits(Plane<double> plane) => [.. plane.Samples.ToArray().Select(BitConverter.DoubleToInt64Bits)];

    private static void Each(SmoothingScene scene, Plane<double> result, Func<int, int, double> expected, double tolerance = 1e-9)
    {
        for (int y = 0; y < result.Height; y++)
        {
            for (int x = 0; x < result.Width; x++)
                Assert.Equal(scene.Flags[x, y] == SampleFlags.None ? expected(x, y) : scene.Plane[x, y], result[x, y], tolerance);
        }
    }
}
