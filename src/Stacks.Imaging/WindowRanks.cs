using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;

namespace Stacks.Imaging;

/// <summary>
/// Ranks of full k x k windows: every sample is taken as taking part. One comparator network works on as many
/// neighbouring pixels as a vector has lanes; the scalar form is the same code with one lane.
/// </summary>
public static class WindowRanks
{
    private const int Alignment = 64;

    /// <summary>The widest form this machine runs.</summary>
    internal static LaneWidth Widest { get; } =
        Vector512.IsHardwareAccelerated ? LaneWidth.Bits512
        : Vector256.IsHardwareAccelerated ? LaneWidth.Bits256
        : Vector128.IsHardwareAccelerated ? LaneWidth.Bits128
        : LaneWidth.Single;

    /// <summary>Ranks of the windows around pixels [first, end) of row <paramref name="y"/>.</summary>
    /// <param name="windows">The plane; its radius is at least that of the window.</param>
    /// <param name="side">Side k of the window, odd.</param>
    /// <param name="network">Network of k * k samples.</param>
    /// <param name="y">Row.</param>
    /// <param name="first">First column.</param>
    /// <param name="end">Column after the last.</param>
    /// <param name="results">Receives, for each wanted rank of the network in turn, end - first samples.</param>
    public static void Row<T>(Windows<T> windows, int side, RankNetwork network, int y, int first, int end, Span<T> results)
        where T : unmanaged, INumber<T> => Row(windows, side, network, y, first, end, results, Widest);

    /// <summary><see cref="Row{T}(Windows{T}, int, RankNetwork, int, int, int, Span{T})"/> with vectors of at most a width.</summary>
    internal static void Row<T>(
        Windows<T> windows, int side, RankNetwork network, int y, int first, int end, Span<T> results, LaneWidth width)
        where T : unmanaged, INumber<T>
    {
        if (width >= LaneWidth.Bits512 && windows.Width >= Vector512<T>.Count)
            Row<T, Vector512<T>, Lanes512<T>>(windows, side, network, y, first, end, results);
        else if (width >= LaneWidth.Bits256 && windows.Width >= Vector256<T>.Count)
            Row<T, Vector256<T>, Lanes256<T>>(windows, side, network, y, first, end, results);
        else if (width >= LaneWidth.Bits128 && windows.Width >= Vector128<T>.Count)
            Row<T, Vector128<T>, Lanes128<T>>(windows, side, network, y, first, end, results);
        else
            Row<T, T, SingleLane<T>>(windows, side, network, y, first, end, results);
    }

    [SkipLocalsInit]
    private static unsafe void Row<T, TVector, TLanes>(
        Windows<T> windows, int side, RankNetwork network, int y, int first, int end, Span<T> results)
        where T : unmanaged, INumber<T>
        where TVector : unmanaged
        where TLanes : ILanes<TVector>
    {
        ArgumentOutOfRangeException.ThrowIfNotEqual(network.Count, side * side, nameof(network));
        int lanes = sizeof(TVector) / sizeof(T), radius = side / 2, count = end - first;
        byte* memory = stackalloc byte[(network.Count * sizeof(TVector)) + Alignment];
        TVector* places = (TVector*)(((nint)memory + Alignment - 1) & ~(nint)(Alignment - 1));
        for (int x = first; x < end; x += lanes)
        {
            // Near the right edge whole vectors begin further left; lanes before x are not stored.
            int start = Math.Min(x, windows.Width - lanes);
            Load(windows.From(start - radius, y - radius), windows.Stride, side, places);
            Run<TVector, TLanes>(network.Comparators, places);
            int stored = Math.Min(lanes, end - x);
            for (int r = 0; r < network.Places.Length; r++)
            {
                new ReadOnlySpan<T>(places + network.Places[r], lanes).Slice(x - start, stored)
                    .CopyTo(results.Slice((r * count) + x - first, stored));
            }
        }
    }

    private static unsafe void Load<T, TVector>(ReadOnlySpan<T> corner, int stride, int side, TVector* places)
        where T : unmanaged
        where TVector : unmanaged
    {
        int lanes = sizeof(TVector) / sizeof(T);
        for (int row = 0; row < side; row++)
        {
            ReadOnlySpan<T> samples = corner.Slice(row * stride, side - 1 + lanes);
            fixed (T* sample = samples)
            {
                for (int column = 0; column < side; column++)
                    *places++ = Unsafe.ReadUnaligned<TVector>(sample + column);
            }
        }
    }

    private static unsafe void Run<TVector, TLanes>(ReadOnlySpan<ushort> comparators, TVector* places)
        where TVector : unmanaged
        where TLanes : ILanes<TVector>
    {
        for (int i = 0; i + 1 < comparators.Length; i += 2)
        {
            TVector* low = places + comparators[i], high = places + comparators[i + 1];
            TVector a = *low, b = *high;
            *low = TLanes.Min(a, b);
            *high = TLanes.Max(a, b);
        }
    }
}
