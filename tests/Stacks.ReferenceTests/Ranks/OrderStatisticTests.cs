using System.Globalization;
using Stacks.Imaging;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Ranks;

/// <summary>Expected normal order statistics against scipy's quadrature of the textbook integral, for all window counts.</summary>
public class OrderStatisticTests
{
    [NeedsFact(Needs.Scipy)]
    public void Expected_interquartile_ranges_are_scipys_integrals()
    {
        int[] counts = [3, 4, 5, 6, 7, 8, 9, 16, 25, 40, 49, 81, 121, 169, 225];
        ToolResult result = Tool.Run(Tool.Python, "-c", $"""
            import numpy
            from scipy.stats import norm, beta
            from scipy.integrate import quad
            # E X(r:n): the r-th of n uniforms follows Beta(r, n - r + 1).
            def mean(r, n): return quad(lambda x: x * beta.pdf(norm.cdf(x), r, n - r + 1) * norm.pdf(x), -9, 9, epsabs=1e-13, limit=400)[0]
            for n in [{string.Join(", ", counts)}]:
                h = (n - 1) * 0.75; low = int(h); upper = mean(low + 1, n)
                if h > low: upper += (h - low) * (mean(low + 2, n) - upper)
                print('%.15g' % (2 * upper))
            """);
        double[] expected = [.. result.Output.Split('\n', StringSplitOptions.RemoveEmptyEntries).Select(l => double.Parse(l, CultureInfo.InvariantCulture))];
        Assert.Equal(counts.Length, expected.Length);
        for (int i = 0; i < counts.Length; i++)
            Assert.Equal(expected[i], NormalOrderStatistics.InterquartileRange(counts[i]), 10);
    }
}
