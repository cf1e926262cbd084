using Stacks.Abstractions;
using Xunit;

namespace Stacks.Tests.Noise;

public class LinearNoiseTests
{
    [Theory]
    [InlineData(0.5, 100)]
    [InlineData(0, 0)]
    public void A_row_is_stabilised_as_its_samples_are(double slope, double pedestal)
    {
        Random random = new(4);
        LinearNoise noise = new(slope, 20, pedestal);
        double[] values = [.. Enumerable.Range(0, 37).Select(_ => 400 * (random.NextDouble() - 0.3)), pedestal], rows = new double[38];
        noise.StabiliseByRow(0, values, rows);
        Assert.Equal([.. values.Select(v => noise.Stabilise(0, 0, v))], rows);
    }
}
