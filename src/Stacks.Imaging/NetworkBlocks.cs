using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>Sizes of the memory that <see cref="NetworkBlocks{T}"/> works in.</summary>
internal static class NetworkBlocks
{
    /// <summary>Bytes of a row of a block: eight vectors of 512 bits, so that a block's lists stay in the fastest memory.</summary>
    public const int BlockBytes = 512;

    /// <summary>Bytes from one row of lists to the next. Not a power of two, which would let rows push each other out.</summary>
    public const int Pitch = BlockBytes + 64;

    /// <summary>Bytes rented for windows of one kind.</summary>
    public static long ScratchBytes<T>(WindowQuantiles quantiles)
        where T : unmanaged
    {
        int side = quantiles.Side, block = BlockBytes / Unsafe.SizeOf<T>();
        long lists = (2 * 2) + (((side / 2) + 2) * 4L * side) + (2L * (quantiles.Full.Ranks.Length + quantiles.Holed.Ranks.Length + quantiles.Probabilities.Length));
        return ((lists + 1) * Pitch) + HoleCounts.ScratchBytes(block, side) + ((long)side * side * Unsafe.SizeOf<T>());
    }
}

/// <summary>
/// Quantiles by <see cref="WindowNetworks"/>: blocks of two rows, one below the other, then the next columns. Where a
/// window has holes, the network with more ranks runs for the vector it is in, and the window's quantiles are taken from
/// those by its count; more holes than the table covers are left to sorting.
/// </summary>
internal sealed unsafe class NetworkBlocks<T> : QuantileBlocks<T>
    where T : unmanaged, INumber<T>
{
    private const int Pitch = NetworkBlocks.Pitch;

    private readonly WindowQuantiles quantiles;
    private readonly ReflectedRows<T> rows;
    private readonly LaneWidth width;
    private readonly int first, end, side, radius, block;
    private readonly NetworkRun<T> rowPair, windowPair, holedPair;
    private readonly HoleCounts? holes;
    private readonly ushort[] fullCounts;
    private readonly T[] gathered, sorted;
    private readonly byte* imageRows, pairs, results, holedResults;
    private readonly nint[] valueRows;
    private readonly (int Result, double Fraction)[] holedPlaces;
    private readonly bool interpolates;
    private readonly byte[] memory;
    private int nextPair, roundedBytes;

    public NetworkBlocks(
        WindowQuantiles quantiles, ReflectedRows<T> rows, int first, int end, IScratch scratch, LaneWidth width, NetworkForm form)
    {
        this.quantiles = quantiles;
        this.rows = rows;
        this.width = width;
        this.first = first;
        this.end = end;
        side = quantiles.Side;
        radius = side / 2;
        block = NetworkBlocks.BlockBytes / sizeof(T);
        long vectors = (end - first) / 2L * (rows.Width * sizeof(T) / VectorBytes);
        rowPair = WindowNetworks.RowPair(side).For<T>(Pitch, width, form, vectors);
        windowPair = WindowNetworks.WindowPair(side, quantiles.Full.Ranks).For<T>(Pitch, width, form, vectors);
        fullCounts = new ushort[block];
        fullCounts.AsSpan().Fill((ushort)(side * side));
        if (!rows.AllTakePart)
        {
            holedPair = WindowNetworks.WindowPair(side, quantiles.Holed.Ranks).For<T>(Pitch, width, form, vectors);
            holes = new HoleCounts(block, side, scratch);
        }

        gathered = new T[side * side];
        sorted = new T[quantiles.Probabilities.Length];
        int lists = 4 + ((radius + 2) * 4 * side)
            + (2 * (quantiles.Full.Ranks.Length + quantiles.Holed.Ranks.Length + quantiles.Probabilities.Length));
        memory = scratch.Rent<byte>((lists + 1) * Pitch, 1).Buffer;
        byte* start = (byte*)(((nint)Unsafe.AsPointer(ref MemoryMarshal.GetArrayDataReference(memory)) + 63) & ~(nint)63);
        imageRows = start;
        pairs = imageRows + (4 * Pitch);
        results = pairs + ((radius + 2) * 4 * side * Pitch);
        holedResults = results + (2 * quantiles.Full.Ranks.Length * Pitch);
        byte* values = holedResults + (2 * quantiles.Holed.Ranks.Length * Pitch);
        valueRows = new nint[2 * quantiles.Probabilities.Length];
        for (int i = 0; i < valueRows.Length; i++)
        {
            // A quantile that is a rank is that rank's row; holes are filled in there.
            (int result, double fraction) = quantiles.Full[0, i % quantiles.Probabilities.Length];
            interpolates |= fraction > 0;
            valueRows[i] = (nint)(fraction > 0
                ? values + (i * Pitch)
                : results + (((i / quantiles.Probabilities.Length * quantiles.Full.Ranks.Length) + result) * Pitch));
        }

        holedPlaces = new (int, double)[(quantiles.Holed.Holes + 1) * sorted.Length];
        for (int i = 0; i < holedPlaces.Length; i++)
            holedPlaces[i] = quantiles.Holed[i / sorted.Length, i % sorted.Length];
        X = -block;
        Y = end;
    }

    /// <inheritdoc/>
    [SkipLocalsInit]
    public override bool Advance()
    {
        Y += 2;
        if (Y >= end)
        {
            X += block;
            if (X >= rows.Width)
                return false;
            Y = first;
            Width = Math.Min(block, rows.Width - X);
            roundedBytes = ((Width * sizeof(T)) + VectorBytes - 1) / VectorBytes * VectorBytes;
            holes?.Start(rows, X, Y);
            nextPair = -1;
            while (nextPair < radius)
                SortPair();
        }

        Height = Math.Min(2, end - Y);
        SortPair();
        byte** pointers = stackalloc byte*[radius + 3];
        byte* pair = PairAt(nextPair);
        for (int i = 0; i < radius + 2; i++)
        {
            pointers[i] = pair;
            pair += 4 * side * Pitch;
            if (pair == results)
                pair = pairs;
        }

        pointers[radius + 2] = results;
        windowPair.Row(pointers, roundedBytes);
        if (interpolates)
            Interpolate();
        if (holes is not null)
            FillHoles(pointers);
        return true;
    }

    /// <inheritdoc/>
    public override ReadOnlySpan<T> Values(int probability, int row) => Value(probability, row)[..Width];

    /// <inheritdoc/>
    public override ReadOnlySpan<ushort> Counts(int row) =>
        holes is { } found ? found.Counts(row)[..Width] : fullCounts.AsSpan(0, Width);

    private int VectorBytes => Math.Max((int)width / 8, sizeof(T));

    private byte* PairAt(int pair) => pairs + ((pair + 1) % (radius + 2) * 4 * side * Pitch);

    /// <summary>Pair j holds the rows first - radius + 1 + 2 j and the one below.</summary>
    [SkipLocalsInit]
    private void SortPair()
    {
        int x = X - radius, y = first - radius + 1 + (2 * nextPair), length = (roundedBytes / sizeof(T)) + side - 1;
        byte** pointers = stackalloc byte*[3];
        pointers[2] = PairAt(nextPair++);
        fixed (T* samples = rows.Buffer)
        {
            for (int i = 0; i < 2; i++)
            {
                if (rows.IsPlain(x, y + i, length))
                {
                    pointers[i] = (byte*)(samples + ((nint)(y + i) * rows.Width) + x);
                    continue;
                }

                pointers[i] = imageRows + (2 * i * Pitch);
                rows.Copy(x, y + i, new Span<T>(pointers[i], length));
            }

            rowPair.Row(pointers, roundedBytes);
        }
    }

    private Span<T> Result(int rank, int row) => new(results + (((row * quantiles.Full.Ranks.Length) + rank) * Pitch), block);

    private Span<T> Value(int probability, int row) => new((byte*)valueRows[(row * quantiles.Probabilities.Length) + probability], block);

    private void Interpolate()
    {
        for (int p = 0; p < quantiles.Probabilities.Length; p++)
        {
            (int result, double fraction) = quantiles.Full[0, p];
            for (int row = 0; row < 2 && fraction > 0; row++)
            {
                Span<T> low = Result(result, row), high = Result(result + 1, row), value = Value(p, row);
                for (int i = 0; i < Width; i++)
                    value[i] = Quantile.Between(low[i], high[i], fraction);
            }
        }
    }

    private void FillHoles(byte** pointers)
    {
        if (!holes!.Count(rows, X, Y))
            return;
        int lanes = VectorBytes / sizeof(T);
        byte** shifted = stackalloc byte*[radius + 3];
        for (int x = 0; x < Width; x += lanes)
        {
            if (!holes.AnyIn(x, Math.Min(lanes, Width - x)))
                continue;
            for (int i = 0; i < radius + 2; i++)
                shifted[i] = pointers[i] + (x * sizeof(T));
            shifted[radius + 2] = holedResults + (x * sizeof(T));
            holedPair.Row(shifted, VectorBytes);
        }

        for (int row = 0; row < Height; row++)
        {
            ReadOnlySpan<byte> found = holes.Holes(row)[..Width];
            for (int i = 0; i < Width; i++)
            {
                int next = found[i..].IndexOfAnyExcept((byte)0);
                if (next < 0)
                    break;
                i += next;
                if (found[i] > quantiles.Holed.Holes)
                {
                    quantiles.BySorting<T>(rows, X + i, Y + row, gathered, sorted);
                    for (int p = 0; p < sorted.Length; p++)
                        Value(p, row)[i] = sorted[p];
                    continue;
                }

                for (int p = 0; p < sorted.Length; p++)
                {
                    (int result, double fraction) = holedPlaces[(found[i] * sorted.Length) + p];
                    T* low = (T*)(holedResults + (((row * quantiles.Holed.Ranks.Length) + result) * Pitch)) + i;
                    *((T*)valueRows[(row * sorted.Length) + p] + i) = fraction == 0
                        ? *low
                        : Quantile.Between(*low, *(T*)((byte*)low + Pitch), fraction);
                }
            }
        }
    }
}
