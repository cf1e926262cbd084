using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using System.Runtime.Intrinsics.X86;

namespace Stacks.Imaging;

/// <summary>
/// The windows along a row of an <see cref="OrdinalTile{T}"/>: counts of ordinals below a pivot, 32 samples of a column at
/// once, and the search from a place in the order to the sample of a rank, 32 samples at once.
/// </summary>
/// <param name="ordinals">The ordinal in the first window's upper left corner.</param>
/// <param name="places">The lowest of the places in order.</param>
/// <param name="side">Side k of the windows.</param>
internal readonly unsafe struct WindowOrdinals(ushort* ordinals, ushort* places, int side)
{
    private const int Lanes = 32;

    private readonly ushort* ordinals = ordinals, places = places;
    private readonly int side = side;
    private readonly uint lastRows = uint.MaxValue >> (Lanes - 1 - ((side - 1) % Lanes));
    private readonly Vector512<byte> reach = Vector512.Create((byte)(side - 1));

    /// <summary>Samples of the first window whose ordinal is below a pivot.</summary>
    public int CountBelow(int pivot)
    {
        int count = 0;
        for (int column = 0; column < side; column++)
            count += InColumn(column, Vector512.Create((ushort)pivot));
        return count;
    }

    /// <summary>How many more samples below a pivot the window at column <paramref name="x"/> has than the one before it.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public int Change(int x, int pivot)
    {
        Vector512<ushort> limit = Vector512.Create((ushort)pivot);
        return InColumn(x + side - 1, limit) - InColumn(x - 1, limit);
    }

    /// <summary>
    /// Finds a sample of a window in ascending order: from an index in the order the one after as many others; with a
    /// negative number, the last but so many before the index. It is nearly always among the nearest samples, which are
    /// looked at without a branch.
    /// </summary>
    /// <param name="corner">Place of the window's upper left sample, in all lanes.</param>
    /// <param name="index">Where to start.</param>
    /// <param name="others">Samples passed over.</param>
    /// <returns>Its index.</returns>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public int Seek(Vector512<byte> corner, int index, int others)
    {
        int isBefore = others >> 31, start = index + (isBefore & (-2 * Lanes));
        ulong near = Inside(start, corner) | ((ulong)Inside(start + Lanes, corner) << Lanes);
        int count = BitOperations.PopCount(near), n = others + (isBefore & count);
        return (uint)n < (uint)count ? start + NthBit(near, n) : Walk(corner, index, others);
    }

    [MethodImpl(MethodImplOptions.NoInlining)]
    private int Walk(Vector512<byte> corner, int index, int others)
    {
        while (others < 0)
        {
            index -= Lanes;
            uint inside = Inside(index, corner);
            others += BitOperations.PopCount(inside);
            if (others >= 0)
                return index + NthBit(inside, others);
        }

        while (true)
        {
            uint inside = Inside(index, corner);
            int count = BitOperations.PopCount(inside);
            if (others < count)
                return index + NthBit(inside, others);
            others -= count;
            index += Lanes;
        }
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private int InColumn(int column, Vector512<ushort> limit)
    {
        ushort* samples = ordinals + ((nint)column << 8);
        int count = 0, row = side;
        for (; row > Lanes; row -= Lanes, samples += Lanes)
            count += BitOperations.PopCount(Vector512.LessThan(Vector512.Load(samples), limit).ExtractMostSignificantBits());
        return count + BitOperations.PopCount((uint)Vector512.LessThan(Vector512.Load(samples), limit).ExtractMostSignificantBits() & lastRows);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private uint Inside(int index, Vector512<byte> corner)
    {
        Vector512<byte> offsets = Vector512.Load(places + index).AsByte() - corner;
        return (uint)Vector512.Equals(Vector512.LessThanOrEqual(offsets, reach).AsUInt16(), Vector512<ushort>.AllBitsSet)
            .ExtractMostSignificantBits();
    }

    private static int NthBit(ulong bits, int n)
    {
        if (Bmi2.X64.IsSupported)
            return BitOperations.TrailingZeroCount(Bmi2.X64.ParallelBitDeposit(1UL << n, bits));
        for (; n > 0; n--)
            bits &= bits - 1;
        return BitOperations.TrailingZeroCount(bits);
    }
}
