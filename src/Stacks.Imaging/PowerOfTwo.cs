using System.Numerics;

namespace Stacks.Imaging;

/// <summary>
/// 2^-u for u &gt;= 0, the weight of Gaussian kernels: exp(-d^2 / 2 s^2) = 2^-u with u = d^2 log2(e) / 2 s^2.
/// u = n - f with n whole and |f| &lt;= 1/2; 2^f is its Taylor polynomial of degree 7, whose remainder
/// (ln 2 / 2)^8 / 8! makes a relative error below 8e-9; 2^-n is put together from its bits. Exactly 1 at u = 0; u above
/// 1000 counts as 1000. Scalar and vector form do the same operations in the same order and agree to the bit.
/// </summary>
public static class PowerOfTwo
{
    private const double LargestExponent = 1000;

    /// <summary>Added and taken away again, it rounds to whole numbers and leaves them in the low bits.</summary>
    private const double Rounder = 1.5 * (1L << 52);

    private const double Ln2 = 0.693147180559945309417;
    private const double C2 = Ln2 * Ln2 / 2;
    private const double C3 = C2 * Ln2 / 3;
    private const double C4 = C3 * Ln2 / 4;
    private const double C5 = C4 * Ln2 / 5;
    private const double C6 = C5 * Ln2 / 6;
    private const double C7 = C6 * Ln2 / 7;

    /// <summary>2^-u.</summary>
    /// <param name="u">0 or more.</param>
    public static double Negative(double u)
    {
        u = Math.Min(u, LargestExponent);
        double shifted = u + Rounder;
        double f = shifted - Rounder - u;
        double power = (((((((((((((C7 * f) + C6) * f) + C5) * f) + C4) * f) + C3) * f) + C2) * f) + Ln2) * f) + 1;
        return power * BitConverter.Int64BitsToDouble((1023L - BitConverter.DoubleToInt64Bits(shifted)) << 52);
    }

    /// <summary>2^-u in every lane.</summary>
    /// <param name="u">0 or more in every lane.</param>
    public static Vector<double> Negative(Vector<double> u)
    {
        u = Vector.Min(u, new Vector<double>(LargestExponent));
        Vector<double> rounder = new(Rounder);
        Vector<double> shifted = u + rounder;
        Vector<double> f = shifted - rounder - u;
        Vector<double> power = (f * C7) + new Vector<double>(C6);
        power = (power * f) + new Vector<double>(C5);
        power = (power * f) + new Vector<double>(C4);
        power = (power * f) + new Vector<double>(C3);
        power = (power * f) + new Vector<double>(C2);
        power = (power * f) + new Vector<double>(Ln2);
        power = (power * f) + Vector<double>.One;
        return power * Vector.AsVectorDouble(Vector.ShiftLeft(new Vector<long>(1023) - Vector.AsVectorInt64(shifted), 52));
    }
}
