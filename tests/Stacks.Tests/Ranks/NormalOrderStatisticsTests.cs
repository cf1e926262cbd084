using Stacks.Imaging;
using Xunit;

namespace Stacks.Tests.Ranks;

public class NormalOrderStatisticsTests
{
    [Theory]
    [InlineData(3, 1.143942)]
    [InlineData(5, 1.273807)]
    [InlineData(7, 1.310466)]
    [InlineData(9, 1.325644)]
    [InlineData(11, 1.333346)]
    [InlineData(13, 1.337782)]
    [InlineData(15, 1.340566)]
    public void Full_windows_have_the_table_of_the_methods(int side, double expected) =>
        Assert.Equal(expected, NormalOrderStatistics.InterquartileRange(side * side), 6);

    [Fact]
    public void Third_highest_of_nine_is_Harters()
    {
        // Harter, Biometrika 48 (1961) 151, table of expected values of normal order statistics: n = 9, third from the top.
        Assert.Equal(0.57197, NormalOrderStatistics.Mean(7, 9), 5);
        Assert.Equal(2 * 0.57197, NormalOrderStatistics.InterquartileRange(9), 4);
    }

    [Fact]
    public void Small_samples_have_their_closed_forms()
    {
        // Textbook: E max of 2 is 1 / sqrt(pi), of 3 it is 3 / (2 sqrt(pi)).
        Assert.Equal(1 / Math.Sqrt(Math.PI), NormalOrderStatistics.Mean(2, 2), 13);
        Assert.Equal(1.5 / Math.Sqrt(Math.PI), NormalOrderStatistics.Mean(3, 3), 13);
        Assert.Equal(0, NormalOrderStatistics.Mean(2, 3), 13);

        // David and Nagaraja, Order Statistics (2003), section 3.2: E X(4:4) = (6 / (pi sqrt(pi))) arctan(sqrt 2) (from memory,
        // and confirmed here by the integral of another kind in the oracle).
        Assert.Equal(6 / (Math.PI * Math.Sqrt(Math.PI)) * Math.Atan(Math.Sqrt(2)), NormalOrderStatistics.Mean(4, 4), 13);
    }

    [Fact]
    public void Another_integral_gives_the_same_for_every_count()
    {
        for (int n = 3; n <= 225; n += n < 30 ? 1 : 13)
            Assert.Equal(AdaptiveMedian.Oracle.NormalRange(n), NormalOrderStatistics.InterquartileRange(n), 10);
    }

    [Fact]
    public void Large_samples_approach_the_normal_interquartile_range() =>
        Assert.InRange(NormalOrderStatistics.InterquartileRange(20_001), 1.348980 - 1.5e-4, 1.348980);

    [Fact]
    public void Means_of_all_ranks_add_up_to_zero_and_rise()
    {
        double[] means = [.. Enumerable.Range(1, 25).Select(r => NormalOrderStatistics.Mean(r, 25))];
        Assert.Equal(0, means.Sum(), 12);
        Assert.Equal(means.Order(), means);
    }
}
