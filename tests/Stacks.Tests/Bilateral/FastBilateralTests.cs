using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.TestSupport;
using Xunit;
using Xunit.Abstractions;

namespace Stacks.Tests.Bilateral;

/// <summary>The fast form against sums over all pixels.</summary>
public class FastBilateralTests(ITestOutputHelper log)
{
    private static readonly LinearNoise Constant = LinearNoise.Constant(FastScene.Noise);
    private static readonly LinearNoise Camera = new(0.5, 60, 100);

    private static Plane<double> Fast(FastScene scene, double spatial, double range, NoiseModel noise, bool conserve = false, double tolerance = 5e-4, Action<string, double>? report = null) =>
        FilterRun.Smooth(
            FilterRun.Prepare(
                new BilateralFilter(),
                scene.Plane,
                ("spatial_sigma", ParameterValue.Of(spatial)),
                ("range_sigma", ParameterValue.Of(range)),
                ("conserve_flux", ParameterValue.Of(conserve)),
                ("tolerance", ParameterValue.Of(tolerance)),
                ("method", ParameterValue.Of("fast"))),
            scene.Plane,
            scene.Flags,
            noise,
            report: report);

    /// <summary>The tolerance is the issue's: 5e-4 range sigmas at star cores, edges, borders and anywhere.</summary>
    [Theory]
    [InlineData(6, 2.5, 50_000, 5e-4)]
    [InlineData(8, 1, 50_000, 5e-4)]
    [InlineData(8, 10, 500, 5e-4)]
    [InlineData(13, 2.5, 500, 5e-4)]
    [InlineData(20, 2.5, 50_000, 5e-4)]
    [InlineData(20, 2.5, 50_000, 1e-4)]
    [InlineData(58, 1, 50_000, 5e-4)]
    [InlineData(58, 40, 50_000, 5e-4)]
    public void Stays_within_tolerance_of_the_sum_over_all_pixels(double spatial, double range, double peak, double tolerance)
    {
        FastScene scene = new(311, 257, 3, peak, missing: 0.02, saturated: 0.01);
        foreach (LinearNoise noise in new[] { Constant, Camera })
        {
            double worst = scene.Worst(Fast(scene, spatial, range, noise, tolerance: tolerance), scene.Places(30, 1), spatial, range, noise);
            log.WriteLine($"{noise.Describe()}: worst {worst:E2} range sigmas");
            Assert.True(worst < tolerance, $"worst {worst:E2} range sigmas");
        }
    }

    /// <summary>Two flat levels that a few pixels lie between: their weights are far out in both Gaussians' tails.</summary>
    [Theory]
    [InlineData(3)]
    [InlineData(5)]
    [InlineData(7)]
    public void Pixels_between_two_plateaus_stay_within_tolerance(double apart)
    {
        FastScene scene = new(200, 180, 4, 0);
        Random random = new(2);
        List<(int, int)> places = [];
        for (int y = 0; y < 180; y++)
        {
            for (int x = 0; x < 200; x++)
                scene.Plane[x, y] = 1000 + (x < 100 ? 0 : apart * FastScene.Noise) + (0.3 * random.NextDouble());
        }

        for (int i = 0; i < 60; i++)
        {
            int x = random.Next(80, 120), y = random.Next(180);
            scene.Plane[x, y] = 1000 + (apart * FastScene.Noise * (0.3 + (0.4 * random.NextDouble())));
            places.Add((x, y));
        }

        double worst = scene.Worst(Fast(scene, 20, 1, Constant), places, 20, 1, Constant);
        log.WriteLine($"worst {worst:E2} range sigmas");
        Assert.True(worst < 5e-4, $"worst {worst:E2} range sigmas");
    }

    /// <summary>A ramp over thousands of levels: the grid takes them batch by batch.</summary>
    [Theory]
    [InlineData(1500)]
    [InlineData(6000)]
    public void Levels_beyond_one_batch_stay_within_tolerance(double span)
    {
        FastScene scene = new(160, 150, 8, 0);
        for (int i = 0; i < scene.Plane.Length; i++)
            scene.Plane.Samples[i] += FastScene.Noise * span * i / scene.Plane.Length;
        double worst = scene.Worst(Fast(scene, 6, 1, Constant), scene.Places(30, 1), 6, 1, Constant);
        log.WriteLine($"worst {worst:E2} range sigmas");
        Assert.True(worst < 5e-4, $"worst {worst:E2} range sigmas");
    }

    [Theory]
    [InlineData(1, 1)]
    [InlineData(1, 40)]
    [InlineData(40, 1)]
    [InlineData(3, 5)]
    [InlineData(17, 64)]
    public void Frames_narrower_than_the_kernel_are_summed_whole(int width, int height)
    {
        FastScene scene = new(width, height, 5, 0, missing: 0.1);
        List<(int, int)> places = [.. Enumerable.Range(0, width * height).Select(i => (i % width, i / width)).Where(p => scene.Flags[p.Item1, p.Item2] == SampleFlags.None)];
        double worst = places.Count == 0 ? 0 : scene.Worst(Fast(scene, 9, 2.5, Constant), places, 9, 2.5, Constant);
        Assert.True(worst < 5e-4, $"worst {worst:E2} range sigmas");
    }

    [Fact]
    public void Samples_that_take_no_part_keep_their_value()
    {
        FastScene scene = new(90, 80, 6, 5000, missing: 0.2, saturated: 0.2);
        foreach (bool conserve in new[] { false, true })
        {
            Plane<double> result = Fast(scene, 7, 2.5, Camera, conserve);
            for (int i = 0; i < result.Length; i++)
            {
                if (scene.Flags.Samples[i] != SampleFlags.None)
                    Assert.Equal(BitConverter.DoubleToInt64Bits(scene.Plane.Samples[i]), BitConverter.DoubleToInt64Bits(result.Samples[i]));
            }
        }
    }

    /// <summary>Against the exchange form written down pair by pair (Milanfar 2013; see the oracle).</summary>
    [Theory]
    [InlineData(2.5, 0)]
    [InlineData(2.5, 20_000)]
    [InlineData(20, 2000)]
    public void The_exchange_form_stays_within_tolerance_conserves_the_total_and_keeps_self_weights(double range, double peak)
    {
        const int width = 61, height = 47;
        const double spatial = 6;
        FastScene scene = new(width, height, 7, peak, missing: 0.05, saturated: 0.05);
        double[] v = scene.Plane.Samples.ToArray();
        bool[] valid = [.. scene.Flags.Samples.ToArray().Select(f => f == SampleFlags.None)];
        double[] t = [.. v.Select(value => Constant.Stabilise(0, 0, value))];
        Plane<double> result = Fast(scene, spatial, range, Constant, conserve: true);
        double[] expected = BilateralOracle.Exchange(v, t, valid, width, height, spatial, range).Result;
        double worst = 0, before = 0, after = 0;
        for (int p = 0; p < v.Length; p++)
        {
            if (!valid[p])
                continue;
            worst = Math.Max(worst, Math.Abs(result.Samples[p] - expected[p]) / (range * FastScene.Noise));
            before += v[p];
            after += result.Samples[p];
        }

        log.WriteLine($"worst {worst:E2} range sigmas, total changes by {(after / before) - 1:E2}");
        Assert.True(worst < 5e-4, $"worst {worst:E2} range sigmas");
        Assert.Equal(1, after / before, 1e-9);
    }
}
