using MathNet.Numerics.Statistics;
using Stacks.Imaging;
using Xunit;

namespace Stacks.ReferenceTests.Ranks;

/// <summary>
/// Type-7 quantiles against Math.NET Numerics (QuantileDefinition.R7), whose own tests cite R, and against the definition
/// of Hyndman and Fan, The American Statistician 50 (1996) 361: p(k) = (k - 1) / (n - 1).
/// </summary>
public class QuantileReferenceTests
{
    [Fact]
    public void Type_7_is_Math_NETs_R7()
    {
        Random random = new(1996);
        for (int n = 1; n <= 60; n++)
        {
            double[] sorted = [.. Enumerable.Range(0, n).Select(_ => (random.NextDouble() * 200) - 100).Order()];
            for (int i = 0; i <= 100; i++)
            {
                double expected = SortedArrayStatistics.QuantileCustom(sorted, i / 100.0, QuantileDefinition.R7);
                Assert.Equal(expected, Quantile.OfSorted<double>(sorted, i / 100.0), 10);
            }
        }
    }

    [Fact]
    public void Each_rank_is_the_quantile_of_its_plotting_position()
    {
        for (int n = 2; n <= 225; n++)
        {
            double[] sorted = [.. Enumerable.Range(1, n).Select(k => Math.Sqrt(k))];
            for (int k = 1; k <= n; k++)
                Assert.Equal(sorted[k - 1], Quantile.OfSorted<double>(sorted, (k - 1) / (double)(n - 1)));
        }
    }
}
