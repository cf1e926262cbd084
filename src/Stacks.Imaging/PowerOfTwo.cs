namespace Stacks.Imaging;

/// <summary>
/// 2^-u for u &gt;= 0, the weight of Gaussian kernels: exp(-d^2 / 2 s^2) = 2^-u with u = d^2 log2(e) / 2 s^2.
/// u = n - f with n whole and |f| &lt;= 1/2; 2^f is its Taylor polynomial of degree 7, whose remainder
/// (ln 2 / 2)^8 / 8! makes a relative error below 8e-9; 2^-n is put together from its bits. Exactly 1 at u = 0; u above
/// 1000 counts as 1000.
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

    /// <summary>2^-u in every lane.</summary>
    /// <param name="u">0 or more in every lane.</param>
    public static TLanes Negative<TLanes>(TLanes u)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        u = TLanes.Min(u, TLanes.All(LargestExponent));
        TLanes shifted = u + TLanes.All(Rounder);
        TLanes f = shifted - TLanes.All(Rounder) - u;
        TLanes power = (TLanes.All(C7) * f) + TLanes.All(C6);
        power = (power * f) + TLanes.All(C5);
        power = (power * f) + TLanes.All(C4);
        power = (power * f) + TLanes.All(C3);
        power = (power * f) + TLanes.All(C2);
        power = (power * f) + TLanes.All(Ln2);
        power = (power * f) + TLanes.All(1);
        return power * TLanes.PowerOfTwo(shifted);
    }
}
