using System.Numerics;

namespace Stacks.SampleStacks;

/// <summary>
/// Random numbers whose stream is written down: xoshiro256** 1.0 (Blackman and Vigna, ACM Trans. Math. Software 47
/// (2021) 36), its state filled by SplitMix64 from the seed, as its authors advise.
/// </summary>
internal sealed class RandomSource
{
    private ulong s0, s1, s2, s3;
    private double spareNormal = double.NaN;

    /// <summary>A stream of its own for each seed.</summary>
    public RandomSource(ulong seed)
        : this(SplitMix(ref seed), SplitMix(ref seed), SplitMix(ref seed), SplitMix(ref seed))
    {
    }

    /// <summary>A stream from a full state, not all zero.</summary>
    public RandomSource(ulong s0, ulong s1, ulong s2, ulong s3) => (this.s0, this.s1, this.s2, this.s3) = (s0, s1, s2, s3);

    /// <summary>One step of SplitMix64 (Steele, Lea and Flood, OOPSLA 2014).</summary>
    public static ulong SplitMix(ref ulong state)
    {
        ulong z = state += 0x9E3779B97F4A7C15;
        z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9;
        z = (z ^ (z >> 27)) * 0x94D049BB133111EB;
        return z ^ (z >> 31);
    }

    /// <summary>64 random bits.</summary>
    public ulong Bits()
    {
        ulong result = BitOperations.RotateLeft(s1 * 5, 7) * 9;
        ulong t = s1 << 17;
        s2 ^= s0;
        s3 ^= s1;
        s1 ^= s2;
        s0 ^= s3;
        s2 ^= t;
        s3 = BitOperations.RotateLeft(s3, 45);
        return result;
    }

    /// <summary>Uniform in (0, 1): the middle of one of 2^52 equal parts.</summary>
    public double Uniform() => ((Bits() >> 12) + 0.5) * (1.0 / (1UL << 52));

    /// <summary>Uniform in (low, high).</summary>
    public double Between(double low, double high) => low + ((high - low) * Uniform());

    /// <summary>Uniform in logarithm between low and high, both above 0.</summary>
    public double LogBetween(double low, double high) =>
        low * Elementary.Exp(Elementary.Log(high / low) * Uniform());

    /// <summary>Uniform among 0 .. count - 1.</summary>
    public int Index(int count) => (int)(Uniform() * count);

    /// <summary>A point on the unit circle, uniform in angle.</summary>
    public (double X, double Y) Direction()
    {
        (double x, double y, double square) = InUnitDisc();
        double length = Math.Sqrt(square);
        return (x / length, y / length);
    }

    /// <summary>Unit normal deviate by the polar method (Marsaglia and Bray, SIAM Review 6 (1964) 260).</summary>
    public double Normal()
    {
        if (!double.IsNaN(spareNormal))
        {
            double spare = spareNormal;
            spareNormal = double.NaN;
            return spare;
        }

        (double x, double y, double square) = InUnitDisc();
        double factor = Math.Sqrt(-2 * Elementary.Log(square) / square);
        spareNormal = y * factor;
        return x * factor;
    }

    /// <summary>
    /// Poisson deviate: by products of uniform deviates below a mean of 12 (Knuth, TAOCP 2, 3.4.1), by transformed
    /// rejection above (Hoermann, Insurance: Mathematics and Economics 12 (1993) 39, algorithm PTRS). Both are exact.
    /// </summary>
    public double Poisson(double mean)
    {
        if (mean < 12)
        {
            double limit = Elementary.Exp(-mean), product = Uniform();
            int count = 0;
            for (; product > limit; count++)
                product *= Uniform();
            return count;
        }

        double b = 0.931 + (2.53 * Math.Sqrt(mean));
        double a = -0.059 + (0.02483 * b);
        double inverseAlpha = 1.1239 + (1.1328 / (b - 3.4));
        double squeeze = 0.9277 - (3.6224 / (b - 2));
        while (true)
        {
            double u = Uniform() - 0.5, v = Uniform();
            double us = 0.5 - Math.Abs(u);
            double k = Math.Floor((((2 * a / us) + b) * u) + mean + 0.43);
            if (us >= 0.07 && v <= squeeze)
                return k;
            if (k < 0 || (us < 0.013 && v > us))
                continue;
            double left = Elementary.Log(v * inverseAlpha / ((a / (us * us)) + b));
            if (left <= (k * Elementary.Log(mean)) - mean - Elementary.LogFactorial(k))
                return k;
        }
    }

    private (double X, double Y, double Square) InUnitDisc()
    {
        while (true)
        {
            double x = (2 * Uniform()) - 1, y = (2 * Uniform()) - 1;
            double square = (x * x) + (y * y);
            if (square < 1)
                return (x, y, square);
        }
    }
}
