using System.Collections.Concurrent;

namespace Stacks.Imaging;

/// <summary>
/// Expected order statistics of n independent unit normals: E X(r:n) = n! / ((r-1)! (n-r)!) times the integral of
/// x P^(r-1) (1-P)^(n-r) p dx, with P and p the normal distribution and density (David and Nagaraja, Order Statistics,
/// 2003; tables: Harter, Biometrika 48 (1961) 151).
/// </summary>
public static class NormalOrderStatistics
{
    private const double End = 8.5;

    private static readonly ConcurrentDictionary<int, double> Ranges = new();

    /// <summary>Expected value of the sample of a rank.</summary>
    /// <param name="rank">1 (lowest) to <paramref name="count"/>.</param>
    /// <param name="count">Samples, 1 or more.</param>
    public static double Mean(int rank, int count)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(rank, 1);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(rank, count);
        double logFactor = Math.Log(count);
        for (int i = 1; i < rank; i++)
            logFactor += Math.Log((double)(count - i) / i);

        // The integrand and all its derivatives vanish at the ends, so the trapezoid rule converges beyond double
        // precision once its step is well below the spread of the rank, which is near 1 / sqrt(n).
        double step = 1 / Math.Max(64, 4 * Math.Sqrt(count)), sum = 0;
        for (double x = step; x <= End; x += step)
        {
            // The two halves are mirror images with P and 1 - P exchanged.
            double below = Math.Log(Distribution(-x)), above = Math.Log(Distribution(x)), density = -x * x / 2;
            sum += x * (Math.Exp(logFactor + ((rank - 1) * above) + ((count - rank) * below) + density)
                - Math.Exp(logFactor + ((rank - 1) * below) + ((count - rank) * above) + density));
        }

        return sum * step / Math.Sqrt(2 * Math.PI);
    }

    /// <summary>c(n): the expected type-7 interquartile range of n unit normals. Sigma is estimated by IQR / c(n).</summary>
    /// <param name="count">Samples, 1 or more.</param>
    public static double InterquartileRange(int count) => Ranges.GetOrAdd(count, static n =>
    {
        (int rank, double fraction) = Quantile.Position(n, 0.75);
        double upper = Mean(rank, n);
        if (fraction > 0)
            upper += fraction * (Mean(rank + 1, n) - upper);
        return 2 * upper;
    });

    // Marsaglia, Journal of Statistical Software 11 (2004) 4: P(x) = 1/2 + p(x) (x + x^3/3 + x^5/(3*5) + ...); beyond 3
    // the continued fraction of the tail (Abramowitz and Stegun 26.2.14), which keeps relative accuracy there.
    private static double Distribution(double x)
    {
        double density = Math.Exp(-x * x / 2) / Math.Sqrt(2 * Math.PI);
        if (Math.Abs(x) > 3)
        {
            double fraction = 0;
            for (int k = 60; k > 0; k--)
                fraction = k / (Math.Abs(x) + fraction);
            double tail = density / (Math.Abs(x) + fraction);
            return x < 0 ? tail : 1 - tail;
        }

        double term = x, sum = x;
        for (int k = 3; Math.Abs(term) > 1e-18; k += 2)
            sum += term *= x * x / k;
        return 0.5 + (density * sum);
    }
}
