using Stacks.Abstractions;
using Xunit;

namespace Stacks.Tests.Noise;

public class StabilisationTests
{
    /// <summary>A row is what its samples are one by one, to the bit, at every length: vectors and what is left behind them.</summary>
    [Fact]
    public void A_row_is_stabilised_as_its_samples_are()
    {
        Random random = new(1);
        foreach (LinearNoise noise in new[] { LinearNoise.Constant(3), new LinearNoise(0.7, 12, 200) })
        {
            for (int length = 1; length < 40; length++)
            {
                double[] values = [.. Enumerable.Range(0, length).Select(_ => random.Next(9) switch
                {
                    0 => double.NaN,
                    1 => -1e12,
                    2 => 1e12,
                    3 => noise.Pedestal,
                    _ => 400 * random.NextDouble(),
                })];
                double[] row = new double[length];
                noise.StabiliseByRow(0, values, row);
                Assert.Equal(values.Select((v, x) => noise.Stabilise(x, 0, v)), row);
            }
        }
    }

    /// <summary>The generalised Anscombe transform, 2/a sqrt(a x + 3/8 a^2 + b) less its value at x = 0 (Starck, Murtagh and Bijaoui 1998).</summary>
    [Fact]
    public void Above_the_pedestal_it_is_the_generalised_Anscombe_transform()
    {
        const double slope = 0.7, floor = 12, pedestal = 200;
        LinearNoise noise = new(slope, floor, pedestal);
        double At(double x) => 2 / slope * Math.Sqrt((slope * x) + (0.375 * slope * slope) + floor);
        foreach (double x in new[] { 0, 1e-3, 1, 50, 1e4 })
            Assert.Equal(At(x) - At(0), noise.Stabilise(0, 0, pedestal + x), 1e-9 * (1 + At(x)));
    }
}
