using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;

namespace Stacks.Imaging;

/// <summary>
/// 2^u for u &lt;= 0, the weight of Gaussian kernels: exp(-d^2 / 2 s^2) = 2^u with u = -d^2 log2(e) / 2 s^2.
/// u = n + f with n whole and |f| &lt;= 1/2; 2^f is a polynomial, 2^n is put together from its bits. Exactly 1 at u = 0;
/// u below -125 counts as -125, which no sum beside a 1 can notice. In float, the polynomial is of degree 5, that with
/// p(0) = 1 whose largest relative error is least, 9.2e-8 before rounding (a linear programme over 4001 places finds it); in
/// double, the Taylor polynomial of degree 7, whose remainder (ln 2 / 2)^8 / 8! makes a relative error below 8e-9.
/// </summary>
/// <typeparam name="TLanes">Lanes to compute in.</typeparam>
/// <typeparam name="T">float or double.</typeparam>
public readonly struct PowerOfTwo<TLanes, T>
    where TLanes : struct, IRealLanes<TLanes, T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const double Ln2 = 0.693147180559945309417;

    /// <summary>Least u, and the coefficients from f^0 on. Read from memory once a kernel, they stay in registers; as constants they would be read for every use.</summary>
    private static readonly T[] Table = Array.ConvertAll(
        typeof(T) == typeof(float)
            ? [-125, 1, 0.6931469775, 0.2402224212, 0.05550733963, 0.009671511324, 0.001326465239, 0, 0]
            : new[] { -125, 1, Ln2, Power(2), Power(3), Power(4), Power(5), Power(6), Power(7) },
        T.CreateTruncating);

    private readonly TLanes least, c0, c1, c2, c3, c4, c5, c6, c7;

    /// <summary>Makes it ready for a kernel's loop.</summary>
    public PowerOfTwo()
    {
        ref T table = ref MemoryMarshal.GetArrayDataReference(Table);
        least = TLanes.Repeat(ref table, 0);
        c0 = TLanes.Repeat(ref table, 1);
        c1 = TLanes.Repeat(ref table, 2);
        c2 = TLanes.Repeat(ref table, 3);
        c3 = TLanes.Repeat(ref table, 4);
        c4 = TLanes.Repeat(ref table, 5);
        c5 = TLanes.Repeat(ref table, 6);
        c6 = TLanes.Repeat(ref table, 7);
        c7 = TLanes.Repeat(ref table, 8);
    }

    /// <summary>2^u in every lane.</summary>
    /// <param name="u">0 or less in every lane.</param>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public TLanes Of(TLanes u)
    {
        u = TLanes.Max(u, least);
        TLanes n = TLanes.Round(u), f = u - n;
        TLanes power = typeof(T) == typeof(float)
            ? c5
            : TLanes.MultiplyAdd(TLanes.MultiplyAdd(c7, f, c6), f, c5);
        power = TLanes.MultiplyAdd(power, f, c4);
        power = TLanes.MultiplyAdd(power, f, c3);
        power = TLanes.MultiplyAdd(power, f, c2);
        power = TLanes.MultiplyAdd(power, f, c1);
        power = TLanes.MultiplyAdd(power, f, c0);
        return TLanes.Scale(power, n);
    }

    /// <summary>(ln 2)^k / k!.</summary>
    private static double Power(int k) => k == 0 ? 1 : Power(k - 1) * Ln2 / k;
}
