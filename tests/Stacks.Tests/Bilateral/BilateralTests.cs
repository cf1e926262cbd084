using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.TestSupport;
using Xunit;
using Xunit.Abstractions;

namespace Stacks.Tests.Bilateral;

public class BilateralTests(ITestOutputHelper log)
{
    private static readonly LinearNoise Camera = LinearNoise.FromCamera(1.46, 3.2, 200, 1);

    /// <summary>
    /// A cut at 4.5 ss and more leaves out 4e-5 of the weight; the oracle cuts at 6 ss.
    /// </summary>
    [Theory]
    [InlineData(false, 1.5, 2.5)]
    [InlineData(true, 1.5, 2.5)]
    [InlineData(false, 1.0, 1.0)]
    [InlineData(true, 2.0, 4.0)]
    public void Agrees_with_the_sum_in_double(bool conserve, double spatial, double range)
    {
        const int width = 29, height = 23;
        Random random = new(7);
        Plane<double> input = FilterRun.PlaneOf(width, height, (x, y) =>
            200 + (3.0 * x) + (x > 15 ? 60 : 0) + (900 * Math.Exp(-(Math.Pow(x - 9, 2) + Math.Pow(y - 11, 2)) / 2.1)) + (5 * random.NextDouble()));
        bool[] valid = new bool[width * height];
        Plane<SampleFlags> flags = FilterRun.PlaneOf(width, height, (x, y) => random.Next(9) switch
        {
            0 => SampleFlags.Missing,
            1 => SampleFlags.Saturated,
            _ => SampleFlags.None,
        });
        for (int p = 0; p < valid.Length; p++)
        {
            valid[p] = flags.Samples[p] == SampleFlags.None;
            if (flags.Samples[p] == SampleFlags.Missing)
                input.Samples[p] = double.NaN;
        }

        Plane<double> output = FilterRun.Smooth(
            FilterRun.Prepare(
                new BilateralFilter(), input, ("spatial_sigma", ParameterValue.Of(spatial)), ("range_sigma", ParameterValue.Of(range)), ("conserve_flux", ParameterValue.Of(conserve))),
            input,
            flags,
            Camera);

        double[] v = input.Samples.ToArray();
        double[] t = [.. v.Select(value => Camera.Stabilise(0, 0, value))];
        double[] expected = conserve
            ? BilateralOracle.Exchange(v, t, valid, width, height, spatial, range).Result
            : BilateralOracle.Plain(v, t, valid, width, height, spatial, range);
        double worst = 0;
        for (int p = 0; p < v.Length; p++)
        {
            if (valid[p])
                worst = Math.Max(worst, Math.Abs(output.Samples[p] - expected[p]) / (range * Camera.Sigma(0, 0, v[p])));
            else
                Assert.Equal(v[p], output.Samples[p]);
        }

        log.WriteLine($"worst {worst:E2} range sigmas");
        Assert.True(worst < 1e-4, $"worst {worst:E2} range sigmas");
    }

    /// <summary>Floats, on a pedestal as on none: all sums are of differences.</summary>
    [Theory]
    [InlineData(false, 0)]
    [InlineData(true, 0)]
    [InlineData(false, 30000)]
    [InlineData(true, 30000)]
    public void Agrees_in_float_with_the_sum_in_double_on_any_pedestal(bool conserve, double pedestal)
    {
        const int width = 37, height = 21;
        const double range = 2.5, sigma = 5;
        Random random = new(3);
        LinearNoise noise = new(0, sigma * sigma, 0);
        Plane<float> input = FilterRun.PlaneOf(width, height, (x, y) => (float)(
            pedestal + (x > 20 ? 40 : 0) + (300 * Math.Exp(-(Math.Pow(x - 9, 2) + Math.Pow(y - 11, 2)) / 2.1)) + (4 * sigma * (random.NextDouble() + random.NextDouble()))));
        Plane<float> output = FilterRun.Smooth(Exact(input, 1.5, range, conserve), input, noise: noise);

        double[] v = [.. input.Samples.ToArray()];
        double[] t = [.. v.Select(value => value / sigma)];
        bool[] valid = [.. v.Select(_ => true)];
        double[] expected = conserve
            ? BilateralOracle.Exchange(v, t, valid, width, height, 1.5, range).Result
            : BilateralOracle.Plain(v, t, valid, width, height, 1.5, range);
        double worst = Enumerable.Range(0, v.Length).Max(p => Math.Abs(output.Samples[p] - expected[p])) / (range * sigma);
        double half = BitConverter.Int32BitsToSingle(BitConverter.SingleToInt32Bits((float)pedestal + 300) + 1) - (pedestal + 300);
        log.WriteLine($"worst {worst:E2} range sigmas");
        Assert.True(worst < 5e-5 + (half / (range * sigma)), $"worst {worst:E2} range sigmas");
    }

    /// <summary>Every shape from one sample on, where the kernel is larger than the frame.</summary>
    [Theory]
    [InlineData(false)]
    [InlineData(true)]
    public void Agrees_with_the_sum_in_double_on_every_small_shape(bool conserve)
    {
        Random random = new(5);
        for (int width = 1; width <= 9; width++)
        {
            for (int height = 1; height <= 9; height++)
            {
                Plane<float> input = FilterRun.PlaneOf(width, height, (_, _) => (float)(300 + (30 * random.NextDouble())));
                Plane<float> output = FilterRun.Smooth(Exact(input, 1.5, 2.5, conserve), input, noise: Camera);
                double[] v = [.. input.Samples.ToArray()];
                double[] t = [.. v.Select(value => Camera.Stabilise(0, 0, value))];
                bool[] valid = [.. v.Select(_ => true)];
                double[] expected = conserve
                    ? BilateralOracle.Exchange(v, t, valid, width, height, 1.5, 2.5).Result
                    : BilateralOracle.Plain(v, t, valid, width, height, 1.5, 2.5);
                for (int p = 0; p < v.Length; p++)
                    Assert.True(Math.Abs(output.Samples[p] - expected[p]) < 1e-4 * 2.5 * Camera.Sigma(0, 0, v[p]), $"{width} x {height}, sample {p}: {output.Samples[p]} for {expected[p]}");
            }
        }
    }

    [Theory]
    [InlineData(1.5)]
    [InlineData(3)]
    public void Conserves_the_total_of_floats_on_a_pedestal(double spatial)
    {
        Random random = new(9);
        Plane<float> input = FilterRun.PlaneOf(300, 200, (x, y) => (float)(
            1000 + (random.Next(60) == 0 ? 3000 * random.NextDouble() : 0) + (20 * (random.NextDouble() + random.NextDouble()))));
        Plane<float> output = FilterRun.Smooth(Exact(input, spatial, 2.5, conserve: true), input, noise: Camera);
        double before = input.Samples.ToArray().Sum(v => (double)v), after = output.Samples.ToArray().Sum(v => (double)v);
        log.WriteLine($"total changes by {(after / before) - 1:E2}");
        Assert.True(Math.Abs((after / before) - 1) < 1e-9, $"total changes by {(after / before) - 1:E2}");
        Assert.NotEqual(input.Samples.ToArray(), output.Samples.ToArray());
    }

    /// <summary>
    /// With a guide that does not depend on the values the filter is linear, and what a frame of one light pixel keeps there
    /// is that pixel's self-weight.
    /// </summary>
    [Fact]
    public void No_pixel_keeps_less_than_nothing_of_itself()
    {
        const int side = 14;
        Random random = new(21);
        GivenGuide noise = new([.. Enumerable.Range(0, side * side).Select(_ => 8 * random.NextDouble() * random.NextDouble())], side);
        for (int p = 0; p < side * side; p++)
        {
            Plane<float> input = FilterRun.PlaneOf(side, side, (x, y) => (y * side) + x == p ? 1f : 0f);
            float self = FilterRun.Smooth(Exact(input, 1.5, 2.5, conserve: true), input, noise: noise).Samples[p];
            Assert.InRange(self, 0, 1);
        }
    }

    private static IFilterStep<float> Exact(Plane<float> input, double spatial, double range, bool conserve) => FilterRun.Prepare(
        new BilateralFilter(),
        input,
        ("spatial_sigma", ParameterValue.Of(spatial)),
        ("range_sigma", ParameterValue.Of(range)),
        ("conserve_flux", ParameterValue.Of(conserve)),
        ("method", ParameterValue.Of("exact")));

    private sealed class GivenGuide(double[] guide, int width) : NoiseModel
    {
        public override double LeastVariance => 1;

        public override double Variance(int x, int y, double level) => 1;

        public override double Stabilise(int x, int y, double value) => guide[(y * width) + x];

        public override string Describe() => "a given guide";
    }
}
