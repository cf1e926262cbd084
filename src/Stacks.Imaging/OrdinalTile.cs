using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>
/// A tile of a plane whose samples are replaced by their ordinals: places in the ascending order of all samples of the tile
/// that take part, ties in any order. Ranks of windows are then ranks of different 16-bit numbers whatever the type of the
/// samples. A place of the tile is the number 256 column + row.
/// </summary>
internal sealed class OrdinalTile<T>
    where T : unmanaged, INumber<T>
{
    /// <summary>Most columns and rows, border included: places and ordinals are 16-bit numbers, with the highest left over.</summary>
    public const int MostSide = 254;

    /// <summary>The ordinal of samples that take no part.</summary>
    public const ushort None = ushort.MaxValue;

    /// <summary>Entries before and after those of <see cref="Places"/> that lie outside of every window.</summary>
    public const int Padding = 64;

    private const int Places16 = 1 << 16;
    private const int DigitBits = 11;

    private readonly ulong[] keys, sorted;
    private readonly ushort[] places, sortedPlaces, partPlaces, partOrdinals;
    private readonly T[] row;
    private int taking;

    /// <summary>Memory of tiles.</summary>
    public OrdinalTile(IScratch scratch)
    {
        keys = scratch.Rent<ulong>(Places16, 1).Buffer;
        sorted = scratch.Rent<ulong>(Places16, 1).Buffer;
        places = scratch.Rent<ushort>(Places16, 1).Buffer;
        sortedPlaces = scratch.Rent<ushort>(Places16 + Padding, 1).Buffer;
        partPlaces = scratch.Rent<ushort>(Places16 + (2 * Padding), 1).Buffer;
        partOrdinals = scratch.Rent<ushort>(Places16 + (2 * Padding), 1).Buffer;
        Ordinals = scratch.Rent<ushort>(Places16 + Padding, 1).Buffer;
        row = scratch.Rent<T>(MostSide, 1).Buffer;
    }

    /// <summary>Bytes rented.</summary>
    public static long ScratchBytes => (Places16 * (2L * sizeof(ulong))) + (Places16 * 5L * sizeof(ushort)) + (6L * Padding * sizeof(ushort))
        + (MostSide * Unsafe.SizeOf<T>());

    /// <summary>The ordinal at each place.</summary>
    public ushort[] Ordinals { get; }

    /// <summary>The places of a part of the tile in ascending order of their ordinals, from index <see cref="Padding"/> on.</summary>
    public ushort[] Places => partPlaces;

    /// <summary>Their ordinals.</summary>
    public ushort[] PartOrdinals => partOrdinals;

    /// <summary>Samples of the part that take part.</summary>
    public int PartCount { get; private set; }

    /// <summary>The sample of an ordinal.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public T Sample(int ordinal) => SampleKeys.ToSample<T>(keys[ordinal]);

    /// <summary>Fills the tile from columns [x, x + width) and rows [y, y + height) of a plane.</summary>
    public void Fill(ReflectedRows<T> rows, int x, int y, int width, int height)
    {
        ulong lowest = ulong.MaxValue, highest = 0;
        int count = 0;
        Span<T> samples = row.AsSpan(0, width);
        for (int j = 0; j < height; j++)
        {
            rows.Copy(x, y + j, samples);
            ReadOnlySpan<byte> outsiders = rows.AllTakePart ? [] : rows.Outsiders(y + j).Slice(x + rows.Radius, width);
            for (int i = 0; i < width; i++)
            {
                if (outsiders.Length > 0 && outsiders[i] != 0)
                {
                    Ordinals[(i << 8) | j] = None;
                    continue;
                }

                ulong key = SampleKeys.Of(samples[i] + T.Zero);
                lowest = Math.Min(lowest, key);
                highest = Math.Max(highest, key);
                keys[count] = key;
                places[count++] = (ushort)((i << 8) | j);
            }
        }

        taking = count;
        Span<ushort> inOrder = sortedPlaces.AsSpan(0, count);
        if (Unsafe.SizeOf<T>() == sizeof(double))
        {
            keys.AsSpan(0, count).Sort(places.AsSpan(0, count));
            places.AsSpan(0, count).CopyTo(inOrder);
        }
        else
        {
            SortByDigits(count, lowest, highest);
            for (int i = 0; i < count; i++)
            {
                inOrder[i] = (ushort)keys[i];
                keys[i] = (keys[i] >> 16) + lowest;
            }
        }

        for (int i = 0; i < count; i++)
            Ordinals[inOrder[i]] = (ushort)i;
        sortedPlaces.AsSpan(count, Padding).Fill(None);
    }

    /// <summary>Lists the places of columns [x, x + width) and rows [y, y + height) of the tile in order.</summary>
    public void Select(int x, int y, int width, int height)
    {
        Vector512<byte> corner = Vector512.Create((ushort)((x << 8) | y)).AsByte();
        Vector512<byte> reach = Vector512.Create((ushort)(((width - 1) << 8) | (height - 1))).AsByte();
        Span<ushort> selected = partPlaces.AsSpan(Padding), selectedOrdinals = partOrdinals.AsSpan(Padding);
        int count = 0;
        for (int first = 0; first < taking; first += Vector512<ushort>.Count)
        {
            Vector512<byte> offsets = Vector512.Create<ushort>(sortedPlaces.AsSpan(first)).AsByte() - corner;
            ulong inside = Vector512.Equals(Vector512.LessThanOrEqual(offsets, reach).AsUInt16(), Vector512<ushort>.AllBitsSet)
                .ExtractMostSignificantBits();
            for (; inside != 0; inside &= inside - 1)
            {
                int ordinal = first + BitOperations.TrailingZeroCount(inside);
                selected[count] = sortedPlaces[ordinal];
                selectedOrdinals[count++] = (ushort)ordinal;
            }
        }

        PartCount = count;
        partPlaces.AsSpan(0, Padding).Fill(None);
        partPlaces.AsSpan(Padding + count, Padding).Fill(None);
        partOrdinals.AsSpan(Padding + count, Padding).Fill(None);
    }

    /// <summary>Least significant digit first, as many digits as the keys differ in; each key with its place in the low bits.</summary>
    private void SortByDigits(int count, ulong lowest, ulong highest)
    {
        Span<ulong> from = keys.AsSpan(0, count), to = sorted.AsSpan(0, count);
        for (int i = 0; i < count; i++)
            from[i] = ((from[i] - lowest) << 16) | places[i];
        Span<int> starts = stackalloc int[1 << DigitBits];
        for (int shift = 16; count > 0 && ((highest - lowest) >> (shift - 16)) != 0; shift += DigitBits)
        {
            starts.Clear();
            foreach (ulong entry in from)
                starts[(int)(entry >> shift) & ((1 << DigitBits) - 1)]++;
            int sum = 0;
            foreach (ref int start in starts)
                (start, sum) = (sum, sum + start);
            foreach (ulong entry in from)
                to[starts[(int)(entry >> shift) & ((1 << DigitBits) - 1)]++] = entry;
            Span<ulong> other = from;
            from = to;
            to = other;
        }

        if (count > 0 && !from.Overlaps(keys))
            from.CopyTo(keys);
    }
}
