using System.Runtime.CompilerServices;

namespace Stacks.Imaging;

/// <summary>
/// 2^u for u &lt;= 0, the weight of Gaussian kernels: exp(-d^2 / 2 s^2) = 2^u with u = -d^2 log2(e) / 2 s^2.
/// u = n + f with n whole and |f| &lt;= 1/2; 2^f is a polynomial, 2^n is put together from its bits. Exactly 1 at u = 0;
/// u below -125 counts as -125, which no sum beside a 1 can notice.
/// </summary>
public static class PowerOfTwo
{
    private const double LeastExponent = -125;

    private const double Ln2 = 0.693147180559945309417;
    private const double C2 = Ln2 * Ln2 / 2;
    private const double C3 = C2 * Ln2 / 3;
    private const double C4 = C3 * Ln2 / 4;
    private const double C5 = C4 * Ln2 / 5;
    private const double C6 = C5 * Ln2 / 6;
    private const double C7 = C6 * Ln2 / 7;

    /// <summary>
    /// 2^u in every lane. In float, the polynomial of degree 5 with p(0) = 1 whose largest relative error is least, 9.2e-8
    /// before rounding (a linear programme over 4001 places finds it); in double, the Taylor polynomial of degree 7, whose
    /// remainder (ln 2 / 2)^8 / 8! makes a relative error below 8e-9.
    /// </summary>
    /// <param name="u">0 or less in every lane.</param>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static TLanes Of<TLanes, T>(TLanes u)
        where TLanes : struct, IRealLanes<TLanes, T>
        where T : unmanaged
    {
        u = TLanes.Max(u, TLanes.All(LeastExponent));
        TLanes n = TLanes.Round(u), f = u - n, power;
        if (typeof(T) == typeof(float))
        {
            power = TLanes.MultiplyAdd(TLanes.All(0.001326465239), f, TLanes.All(0.009671511324));
            power = TLanes.MultiplyAdd(power, f, TLanes.All(0.05550733963));
            power = TLanes.MultiplyAdd(power, f, TLanes.All(0.2402224212));
            power = TLanes.MultiplyAdd(power, f, TLanes.All(0.6931469775));
        }
        else
        {
            power = TLanes.MultiplyAdd(TLanes.All(C7), f, TLanes.All(C6));
            power = TLanes.MultiplyAdd(power, f, TLanes.All(C5));
            power = TLanes.MultiplyAdd(power, f, TLanes.All(C4));
            power = TLanes.MultiplyAdd(power, f, TLanes.All(C3));
            power = TLanes.MultiplyAdd(power, f, TLanes.All(C2));
            power = TLanes.MultiplyAdd(power, f, TLanes.All(Ln2));
        }

        return TLanes.Scale(TLanes.MultiplyAdd(power, f, TLanes.All(1)), n);
    }
}
