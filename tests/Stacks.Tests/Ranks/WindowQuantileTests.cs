using System.Numerics;
using Stacks.Imaging;
using Xunit;

namespace Stacks.Tests.Ranks;

/// <summary>Quantiles of windows with missing samples against the definition, and the definition against worked examples.</summary>
public class WindowQuantileTests
{
    [Theory]
    [InlineData(0.02)]
    [InlineData(0.3)]
    [InlineData(0.9)]
    public void Windows_with_missing_samples_have_the_quantiles_of_their_own_count(double missing)
    {
        Holed<ushort>(missing);
        Holed<short>(missing);
        Holed<float>(missing);
        Holed<double>(missing);
    }

    private static void Holed<T>(double missing)
        where T : unmanaged, INumber<T>
    {
        // Binary fractions, so that ties of integers are ties in binary too.
        double[] probabilities = [0, 0.125, 0.25, 0.5, 0.75, 1];
        bool isInteger = T.One / (T.One + T.One) == T.Zero;
        foreach (int side in new[] { 3, 5, 9, 11, 31 })
        {
            WindowQuantiles quantiles = new(side, probabilities);
            foreach ((int width, int height) in new[] { (1, 1), (2, 3), (9, 4), (70, 9), (130, 3) })
            {
                RankScene<T> scene = new(width, height, side + width, missing);
                foreach (WindowResults<T> results in WindowResults<T>.AllForms(quantiles, scene.Rows(side / 2)))
                {
                    for (int i = 0; i < width * height; i++)
                    {
                        (int x, int y) = (i % width, i / width);
                        List<T> sorted = scene.Sorted(x, y, side);
                        Assert.Equal(sorted.Count, results.Counts[i]);
                        for (int p = 0; p < probabilities.Length && sorted.Count > 0; p++)
                        {
                            // Hyndman and Fan 1996, definition 7: x[j] + (h - j)(x[j+1] - x[j]), h = (n - 1) p + 1.
                            decimal h = (sorted.Count - 1) * (decimal)probabilities[p];
                            int j = (int)decimal.Floor(h);
                            double low = double.CreateChecked(sorted[j]), high = double.CreateChecked(sorted[Math.Min(j + 1, sorted.Count - 1)]);
                            double exact = low + ((double)(h - j) * (high - low));
                            if (isInteger)
                            {
                                // Products of decimals decide ties exactly.
                                decimal tie = (decimal)low + ((h - j) * ((decimal)high - (decimal)low));
                                Assert.Equal((double)decimal.Round(tie, MidpointRounding.ToEven), double.CreateChecked(results.Values[p][i]));
                            }
                            else
                            {
                                double tolerance = (typeof(T) == typeof(float) ? 1e-7 : 2e-16) * Math.Max(Math.Abs(low), Math.Abs(high));
                                Assert.InRange(double.CreateChecked(results.Values[p][i]), exact - tolerance, exact + tolerance);
                            }
                        }
                    }
                }
            }
        }
    }

    [Fact]
    public void Even_counts_take_the_mean_of_the_middle_ranks_rounded_half_to_even()
    {
        Assert.Equal((ushort)2, Quantile.OfSorted<ushort>([1, 2, 3, 9], 0.5)); // 2.5
        Assert.Equal((ushort)4, Quantile.OfSorted<ushort>([1, 3, 4, 9], 0.5)); // 3.5
        Assert.Equal((short)-2, Quantile.OfSorted<short>([-9, -3, -2, 0], 0.5)); // -2.5
        Assert.Equal((short)0, Quantile.OfSorted<short>([-9, -1, 0, 0], 0.5)); // -0.5
        Assert.Equal((ushort)65534, Quantile.OfSorted<ushort>([65533, 65534, 65535, 65535], 0.5)); // 65534.5, beyond 16-bit sums
        Assert.Equal(2.5f, Quantile.OfSorted<float>([1, 2, 3, 9], 0.5));
        Assert.Equal(3.5, Quantile.OfSorted<double>([1, 3, 4, 9], 0.5));
    }

    [Fact]
    public void A_share_that_is_no_binary_fraction_still_hits_its_rank()
    {
        // 100 x 0.07 is 7.000000000000001 in binary: the rank meant is 8 of 101.
        Assert.Equal((8, 0.0), Quantile.Position(101, 0.07));
        Assert.Equal((1, 0.0), Quantile.Position(1, 0.3));
        Assert.Equal((4, 0.0), Quantile.Position(4, 1));
    }

    [Fact]
    public void A_quantile_never_leaves_the_two_samples_it_lies_between()
    {
        Random random = new(7);
        for (int i = 0; i < 20_000; i++)
        {
            double a = random.NextDouble(), b = a + (random.NextDouble() * Math.Pow(10, -random.Next(18)));
            Assert.InRange(Quantile.Between(a, b, random.NextDouble()), a, b);
        }
    }
}
