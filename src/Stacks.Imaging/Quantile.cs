using System.Numerics;
using System.Runtime.CompilerServices;

namespace Stacks.Imaging;

/// <summary>
/// Type-7 quantile (Hyndman and Fan, The American Statistician 50 (1996) 361): with h = (n - 1) p + 1, the sample of
/// rank h, or between ranks the straight line from one to the next.
/// </summary>
public static class Quantile
{
    // Probabilities such as 0.07 are not binary fractions: a rank that close to a whole number is meant to be whole.
    private const double Whole = 1e-9;

    /// <summary>Rank (from 1) at or below the quantile, and how far it lies on the way to the next, in [0, 1).</summary>
    public static (int Rank, double Fraction) Position(int count, double probability)
    {
        double place = (count - 1) * probability;
        double whole = Math.Round(place);
        if (Math.Abs(place - whole) > Whole)
            whole = Math.Floor(place);
        return ((int)whole + 1, Math.Max(0, place - whole) > Whole ? place - whole : 0);
    }

    /// <summary>The quantile of samples in ascending order, 1 or more; rounded half to even in integer types.</summary>
    public static T OfSorted<T>(ReadOnlySpan<T> sorted, double probability)
        where T : unmanaged, INumber<T>
    {
        (int rank, double fraction) = Position(sorted.Length, probability);
        return fraction == 0 ? sorted[rank - 1] : Between(sorted[rank - 1], sorted[rank], fraction);
    }

    /// <summary>low + fraction (high - low), never beyond high; rounded half to even in integer types.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static T Between<T>(T low, T high, double fraction)
        where T : unmanaged, INumber<T>
    {
        double a = double.CreateTruncating(low), b = double.CreateTruncating(high), between = a + (fraction * (b - a));
        if (between > b)
            between = b;

        // Between two samples nothing has to be held at the ends of the type.
        if (typeof(T) == typeof(ushort))
            return Unsafe.BitCast<ushort, T>((ushort)(int)Math.Round(between));
        if (typeof(T) == typeof(short))
            return Unsafe.BitCast<short, T>((short)(int)Math.Round(between));
        return T.CreateTruncating(between);
    }
}
