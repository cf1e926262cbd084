using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Imaging;

namespace Stacks.Filters.LocalStatistics;

/// <summary>y = v - min(1, s2_noise / s2_local) (v - centre); Lee 1980. A window without variance leaves v.</summary>
internal static class Shrinkage
{
    /// <summary>Fewest samples of a window that say something of its variance; below, the pixel is left.</summary>
    public const int LeastCount = 3;

    /// <summary>y.</summary>
    /// <param name="value">v.</param>
    /// <param name="centre">Local mean or median.</param>
    /// <param name="noise">Variance of the noise at the centre's level.</param>
    /// <param name="local">Local variance.</param>
    public static double Of(double value, double centre, double noise, double local) =>
        local > 0 ? value - (Math.Min(1, noise / local) * (value - centre)) : value;

    /// <summary>y for neighbouring pixels, the local variance being squares / (n - 1); v where n is below <see cref="LeastCount"/>.</summary>
    public static void Row<T>(
        ReadOnlySpan<T> values, ReadOnlySpan<double> means, ReadOnlySpan<double> noises, ReadOnlySpan<double> squares, ReadOnlySpan<double> counts, Span<T> result, int lanes)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        int done = lanes switch
        {
            8 => Vectors<T, DoubleLanes512>(values, means, noises, squares, counts, result),
            4 => Vectors<T, DoubleLanes256>(values, means, noises, squares, counts, result),
            2 => Vectors<T, DoubleLanes128>(values, means, noises, squares, counts, result),
            _ => 0,
        };
        Pixels(values[done..], means[done..], noises[done..], squares[done..], counts[done..], result[done..]);
    }

    private static int Vectors<T, TLanes>(
        ReadOnlySpan<T> values, ReadOnlySpan<double> means, ReadOnlySpan<double> noises, ReadOnlySpan<double> squares, ReadOnlySpan<double> counts, Span<T> result)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        ref T v = ref MemoryMarshal.GetReference(values), y = ref MemoryMarshal.GetReference(result);
        ref double m = ref MemoryMarshal.GetReference(means), s2 = ref MemoryMarshal.GetReference(noises), q = ref MemoryMarshal.GetReference(squares), n = ref MemoryMarshal.GetReference(counts);
        TLanes one = TLanes.All(1), least = TLanes.All(LeastCount), tiny = TLanes.All(double.Epsilon);
        int x = 0;
        for (; x <= values.Length - TLanes.Count; x += TLanes.Count)
        {
            TLanes count = TLanes.Load(ref n, x), square = TLanes.Load(ref q, x);
            if (!TLanes.AllAtLeast(count, least) || !TLanes.AllAtLeast(square, tiny))
            {
                Range some = x..(x + TLanes.Count);
                Pixels(values[some], means[some], noises[some], squares[some], counts[some], result[some]);
                continue;
            }

            TLanes value = Load<T, TLanes>(ref v, x);
            TLanes share = TLanes.Min(one, TLanes.Load(ref s2, x) * (count - one) / square);
            Store(value - (share * (value - TLanes.Load(ref m, x))), ref y, x);
        }

        return x;
    }

    private static void Pixels<T>(
        ReadOnlySpan<T> values, ReadOnlySpan<double> means, ReadOnlySpan<double> noises, ReadOnlySpan<double> squares, ReadOnlySpan<double> counts, Span<T> result)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        for (int x = 0; x < values.Length; x++)
        {
            result[x] = counts[x] < LeastCount || !(squares[x] > 0)
                ? values[x]
                : T.CreateTruncating(Of(double.CreateTruncating(values[x]), means[x], noises[x] * (counts[x] - 1), squares[x]));
        }
    }

    private static TLanes Load<T, TLanes>(ref T start, nint offset)
        where TLanes : struct, IDoubleLanes<TLanes> =>
        typeof(T) == typeof(float) ? TLanes.Load(ref Unsafe.As<T, float>(ref start), offset) : TLanes.Load(ref Unsafe.As<T, double>(ref start), offset);

    private static void Store<T, TLanes>(TLanes lanes, ref T start, nint offset)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        if (typeof(T) == typeof(float))
            lanes.Store(ref Unsafe.As<T, float>(ref start), offset);
        else
            lanes.Store(ref Unsafe.As<T, double>(ref start), offset);
    }
}
