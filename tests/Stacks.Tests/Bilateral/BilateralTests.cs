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
}
