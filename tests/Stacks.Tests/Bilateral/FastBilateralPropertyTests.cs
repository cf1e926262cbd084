using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.TestSupport;
using Xunit;
using Xunit.Abstractions;

namespace Stacks.Tests.Bilateral;

/// <summary>What holds for the fast form on any frame.</summary>
public class FastBilateralPropertyTests(ITestOutputHelper log)
{
    private static readonly LinearNoise Camera = new(0.5, 60, 100);

    private static FastBilateralStep<T> Step<T>(Plane<T> plane, bool conserve, double spatial = 7, double range = 2.5, int? vectorBits = null)
        where T : unmanaged, System.Numerics.IBinaryFloatingPointIeee754<T>
    {
        SpatialGrid grid = SpatialGrid.Of(spatial, 5e-4, plane.Width, plane.Height);
        BilateralStep<T> exact = new(new SpatialKernel(spatial, plane.Width, plane.Height), range, conserve, []);
        FastBilateralStep<T> step = new(grid, LevelWeights.Of(5e-4), range, conserve, false, exact, []);
        return vectorBits is { } bits ? new(grid, LevelWeights.Of(5e-4), range, conserve, false, exact, []) { VectorBits = bits } : step;
    }

    [Theory]
    [InlineData(0.1, 300, 200)]
    [InlineData(1e7 / 3, 64, 41)]
    [InlineData(-250, 1, 1)]
    [InlineData(1000, 5, 130)]
    public void Constants_stay_constant_to_the_bit(double level, int width, int height)
    {
        foreach (bool conserve in new[] { false, true })
        {
            Plane<double> plane = FilterRun.PlaneOf(width, height, (_, _) => level);
            Assert.All(FilterRun.Smooth(Step(plane, conserve), plane, noise: Camera).Samples.ToArray(), v => Assert.Equal(level, v));
            Plane<float> single = FilterRun.PlaneOf(width, height, (_, _) => (float)level);
            Assert.All(FilterRun.Smooth(Step(single, conserve), single, noise: Camera).Samples.ToArray(), v => Assert.Equal((float)level, v));
        }
    }

    [Fact]
    public void Bands_and_vector_widths_do_not_change_a_bit()
    {
        foreach ((int width, int height) in new[] { (1, 1), (33, 2), (130, 97), (61, 200) })
        {
            FastScene scene = new(width, height, 11, 20_000, missing: 0.1, saturated: 0.05);
            foreach (bool conserve in new[] { false, true })
            {
                double[] scalar = FilterRun.Smooth(Step(scene.Plane, conserve, vectorBits: 0), scene.Plane, scene.Flags, Camera).Samples.ToArray();
                foreach (int bits in new[] { 128, 256, 512 })
                    Assert.Equal(scalar, FilterRun.Smooth(Step(scene.Plane, conserve, vectorBits: bits), scene.Plane, scene.Flags, Camera).Samples.ToArray());
                foreach (int bands in new[] { 2, 3, 7 })
                    Assert.Equal(scalar, FilterRun.Smooth(Step(scene.Plane, conserve), scene.Plane, scene.Flags, Camera, bands).Samples.ToArray());
            }
        }
    }

    /// <summary>A pedestal of 1e6 noise sigmas leaves doubles their digits: results differ from those without by less than 1e-6 noise sigmas.</summary>
    [Fact]
    public void A_pedestal_costs_no_digits()
    {
        const double pedestal = 1e7;
        foreach (bool conserve in new[] { false, true })
        {
            FastScene scene = new(150, 140, 12, 5000, pedestal: 0);
            Plane<double> raised = FilterRun.PlaneOf(150, 140, (x, y) => scene.Plane[x, y] + pedestal);
            LinearNoise noise = LinearNoise.Constant(FastScene.Noise);
            Plane<double> low = FilterRun.Smooth(Step(scene.Plane, conserve), scene.Plane, noise: noise);
            Plane<double> high = FilterRun.Smooth(Step(raised, conserve), raised, noise: noise);
            double most = Enumerable.Range(0, low.Length).Max(i => Math.Abs(high.Samples[i] - pedestal - low.Samples[i])) / FastScene.Noise;
            log.WriteLine($"worst {most:E2} noise sigmas");
            Assert.True(most < 1e-4, $"worst {most:E2} noise sigmas");
        }
    }

    [Theory]
    [InlineData(2.5, 0)]
    [InlineData(2.5, 50_000)]
    [InlineData(50, 2000)]
    public void The_exchange_form_conserves_the_total(double range, double peak)
    {
        FastScene scene = new(300, 210, 13, peak, missing: 0.02, saturated: 0.01);
        Plane<double> result = FilterRun.Smooth(Step(scene.Plane, true, range: range), scene.Plane, scene.Flags, Camera);
        double before = 0, after = 0, moved = 0;
        for (int i = 0; i < result.Length; i++)
        {
            if (scene.Flags.Samples[i] != SampleFlags.None)
                continue;
            before += scene.Plane.Samples[i];
            after += result.Samples[i];
            moved += Math.Abs(result.Samples[i] - scene.Plane.Samples[i]);
        }

        log.WriteLine($"total changes by {(after / before) - 1:E2} of itself, {(after - before) / moved:E2} of what moved");
        Assert.Equal(1, after / before, 1e-9);
    }

    /// <summary>
    /// A negative self-weight would push a pixel beyond its neighbours: results lie in the frame's range, by the tolerance.
    /// </summary>
    [Theory]
    [InlineData(2.5)]
    [InlineData(20)]
    public void No_result_leaves_the_range_of_the_frame(double range)
    {
        FastScene scene = new(140, 120, 14, 20_000);
        double low = scene.Plane.Samples.ToArray().Min(), high = scene.Plane.Samples.ToArray().Max();
        LinearNoise noise = LinearNoise.Constant(FastScene.Noise);
        foreach (bool conserve in new[] { false, true })
        {
            double[] result = FilterRun.Smooth(Step(scene.Plane, conserve, range: range), scene.Plane, noise: noise).Samples.ToArray();
            double slack = 5e-4 * range * FastScene.Noise;
            Assert.InRange(result.Min(), low - slack, high);
            Assert.InRange(result.Max(), low, high + slack);
        }
    }

    /// <summary>
    /// The reported error is a maximum over 10 samples; over some hundred places, chosen for being hard, it may be larger,
    /// but by no more than 10 times.
    /// </summary>
    [Theory]
    [InlineData(8, 1)]
    [InlineData(8, 10)]
    [InlineData(20, 2.5)]
    public void The_reported_error_is_the_right_size(double spatial, double range)
    {
        FastScene scene = new(260, 240, 15, 20_000, missing: 0.01);
        LinearNoise noise = LinearNoise.Constant(FastScene.Noise);
        Dictionary<string, double> reported = [];
        Plane<double> result = FilterRun.Smooth(
            Step(scene.Plane, false, spatial, range), scene.Plane, scene.Flags, noise, report: (name, value) => reported[name] = value);
        double worst = scene.Worst(result, scene.Places(50, 2), spatial, range, noise);
        log.WriteLine($"reported {reported["estimated_error"]:E2}, worst {worst:E2} range sigmas");
        Assert.InRange(reported["estimated_error"], worst / 10, 5e-4);
    }

    /// <summary>A result that is wrong at its brightest sample is reported as such.</summary>
    [Fact]
    public void The_reported_error_sees_a_wrong_result()
    {
        FastScene scene = new(100, 90, 16, 20_000);
        LinearNoise noise = LinearNoise.Constant(FastScene.Noise);
        FrameContext context = new()
        {
            FrameIndex = 0,
            Noise = noise,
            Bands = Stacks.Imaging.SerialBands.Instance,
            Scratch = new Stacks.Imaging.Scratch(),
        };
        GuideLevels guide = new(100, 90, context.Scratch);
        LevelWeights weights = LevelWeights.Of(5e-4);
        Assert.True(guide.Fill(scene.Plane, scene.Flags, 1 / (2.5 * weights.Spacing), context));
        SpatialGrid grid = SpatialGrid.Of(7, 5e-4, 100, 90);
        LevelFrame<double> frame = new(grid, weights, guide, new LevelSlots(grid, guide, weights.Count, context.Scratch), scene.Plane, context);
        Plane<double> result = FilterRun.Smooth(Step(scene.Plane, false), scene.Plane, noise: noise);
        Assert.InRange(ErrorEstimate.Of(frame, null, result, 2.5, context), 0, 5e-4);
        int brightest = Enumerable.Range(0, result.Length).MaxBy(i => scene.Plane.Samples[i]);
        result.Samples[brightest] += FastScene.Noise;
        Assert.Equal(1 / 2.5, ErrorEstimate.Of(frame, null, result, 2.5, context), 1e-3);
    }
}
