using System.Numerics;
using Stacks.Formats.Fits.Tiles;
using Xunit;

namespace Stacks.Tests.FitsTiles;

/// <summary>Quantised samples against FITS Standard 4.0, section 10.2 and appendix I, sample by sample.</summary>
public class QuantisationTests
{
    /// <summary>
    /// The "minimal standard" generator begins 16807, 282475249, 1622650073, 984943658, 1144108930 from 1 (S. Park and
    /// K. Miller, CACM 31, 1192, 1988; values from memory), and the FITS Standard gives 1043618065 as its 10,000th number.
    /// </summary>
    [Fact]
    public void The_oracle_draws_the_published_numbers()
    {
        Assert.Equal([16807, 282475249, 1622650073, 984943658, 1144108930], Enumerable.Range(0, 5).Select(State));
        Assert.Equal(1043618065, State(9999));
    }

    [Theory]
    [InlineData(0)]
    [InlineData(1)]
    [InlineData(4711)]
    [InlineData(9999)]
    [InlineData(10000)]
    [InlineData(123456789012)]
    public void Each_sample_loses_the_random_number_that_was_added(long seed)
    {
        int[] integers = Integers();
        foreach (bool keepsZero in new[] { false, true })
        {
            double[] wide = new double[integers.Length];
            float[] narrow = new float[integers.Length];
            Quantisation.Restore(integers, 0.37, -12.5, -2147483647, seed, keepsZero, wide.AsSpan());
            Quantisation.Restore(integers, 0.37, -12.5, -2147483647, seed, keepsZero, narrow.AsSpan());
            double[] expected = Oracle(integers, 0.37, -12.5, seed, keepsZero);
            Assert.Equal(expected, wide);
            Assert.Equal(expected.Select(f => (float)f), narrow);
        }
    }

    [Fact]
    public void Without_dithering_samples_lie_on_the_steps()
    {
        int[] integers = [0, 1, -1, int.MaxValue, int.MinValue, Quantisation.Zero, -7];
        double[] samples = new double[integers.Length];
        Quantisation.Restore(integers, 0.25, 3, -7, null, keepsZero: false, samples.AsSpan());
        Assert.Equal([3, 3.25, 2.75, 536870914.75, -536870909, -536870908.5, double.NaN], samples);
    }

    /// <summary>More samples than the sequence has numbers; among them what stands for NaN and for 0.</summary>
    private static int[] Integers()
    {
        int[] integers = [.. Enumerable.Range(0, 21_000).Select(i => (i * 7919 % 4001) - 2000)];
        foreach (int i in new[] { 0, 5, 9_999, 20_999 })
            (integers[i], integers[i / 2]) = (-2147483647, -2147483646);
        return integers;
    }

    private static double[] Oracle(int[] integers, double scale, double zero, long seed, bool keepsZero)
    {
        float[] random = [.. Enumerable.Range(0, 10_000).Select(i => (float)(State(i) / 2147483647.0))];
        int line = (int)(seed % 10_000), next = (int)Math.Floor(500.0 * random[line]);
        double[] samples = new double[integers.Length];
        for (int i = 0; i < integers.Length; i++)
        {
            samples[i] = integers[i] switch
            {
                -2147483647 => double.NaN,
                -2147483646 when keepsZero => 0,
                _ => ((integers[i] - (double)random[next] + 0.5) * scale) + zero,
            };
            next++;
            if (next == 10_000)
            {
                line = line == 9_999 ? 0 : line + 1;
                next = (int)Math.Floor(500.0 * random[line]);
            }
        }

        return samples;
    }

    /// <summary>16807^(i + 1) modulo 2^31 - 1, by its power and not by its steps.</summary>
    private static int State(int i) => (int)BigInteger.ModPow(16807, i + 1, 2147483647);
}
