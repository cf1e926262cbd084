using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>
/// Sums of d and d^2, d = v - pivot, over the k x k windows of a tile: <see cref="SumRows"/> over their rows, then
/// <see cref="Moments"/> over their columns, one row of windows after the other.
/// </summary>
/// <typeparam name="T">float or double.</typeparam>
internal readonly struct WindowSums<T>
    where T : unmanaged
{
    /// <summary>Samples in a row of a tile with its border: a multiple of every number of lanes.</summary>
    public const int RegionWidth = 256;

    /// <summary>Behind a row of sums stand zeros, for vectors that reach on.</summary>
    private const int RowWidth = RegionWidth + 32;

    /// <summary>Of a row of sums of d and the one of d^2 behind it, all but the last zeros.</summary>
    private const int SumLength = (2 * RowWidth) - 16;

    /// <summary>Numbers of a row of the strip: two vectors of d, two of d^2.</summary>
    private const int StripWidth = 4 * 8;

    private readonly int side;
    private readonly double keptShare;

    /// <summary>Row i: sums of a few columns from row i of the upper block to its end.</summary>
    private readonly AlignedRows ends;

    /// <summary>Rows 2i and 2i + 1: sums of d and d^2 over the rows i to i + k - 1 of the region.</summary>
    private readonly AlignedRows columns;

    /// <summary>Sums of d and d^2 over eight columns, then over the k mod 8 columns that are left.</summary>
    private readonly AlignedRows parts;

    private readonly AlignedRows moments;

    /// <summary>Rents the memory.</summary>
    /// <param name="side">k, odd, 3 to 63.</param>
    /// <param name="lostBits">Bits that squares may lose.</param>
    /// <param name="scratch">Gives the memory.</param>
    public WindowSums(int side, int lostBits, IScratch scratch)
    {
        this.side = side;
        keptShare = Math.ScaleB(1, -lostBits);
        ends = new AlignedRows(StripWidth, side, scratch);
        columns = new AlignedRows(RowWidth, 2 * side, scratch);
        parts = new AlignedRows(RowWidth, 4, scratch);
        moments = new AlignedRows(RegionWidth, 3, scratch);
        columns.Clear();
        parts.Clear();
    }

    /// <summary>Bytes that are rented.</summary>
    public static long ScratchBytes(int side) =>
        AlignedRows.ScratchBytes(StripWidth, side) + AlignedRows.ScratchBytes(RowWidth, (2 * side) + 4) + AlignedRows.ScratchBytes(RegionWidth, 3);

    /// <summary>Windows along x in a tile.</summary>
    public int Width => RegionWidth - side + 1;

    /// <summary>Means.</summary>
    public Span<double> Means => moments[0];

    /// <summary>Sums of squared deviations.</summary>
    public Span<double> Squares => moments[1];

    /// <summary>What squares are at least, where they keep their digits.</summary>
    public Span<double> Limits => moments[2];

    /// <summary>Sums over the k rows of each row of windows, from the end of the upper block of k rows and the start of the lower; a few columns at a time.</summary>
    /// <param name="source">First sample of the region.</param>
    /// <param name="stride">Samples from one row to the next.</param>
    /// <param name="pivot">The pivot.</param>
    public void SumRows<TLanes>(ref T source, nint stride, double pivot)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        int lanes = TLanes.Count;
        TLanes p = TLanes.All(pivot);
        ref double end = ref ends.First, sums = ref columns.First;
        for (nint x = 0; x < RegionWidth; x += 2 * lanes)
        {
            TLanes s = TLanes.All(0), t = s, s2 = s, t2 = s;
            for (int i = side - 1; i >= 0; i--)
            {
                Add(ref Unsafe.Add(ref source, (i * stride) + x), p, ref s, ref t, ref s2, ref t2);
                ref double here = ref Unsafe.Add(ref end, StripWidth * i);
                s.Store(ref here, 0);
                t.Store(ref here, lanes);
                s2.Store(ref here, 2 * lanes);
                t2.Store(ref here, 3 * lanes);
            }

            s = TLanes.All(0);
            t = s2 = t2 = s;
            for (int i = 0; i < side; i++)
            {
                if (i > 0)
                    Add(ref Unsafe.Add(ref source, ((side - 1 + i) * stride) + x), p, ref s, ref t, ref s2, ref t2);
                ref double here = ref Unsafe.Add(ref end, StripWidth * i), sum = ref Unsafe.Add(ref sums, (2 * RowWidth * i) + x);
                (TLanes.Load(ref here, 0) + s).Store(ref sum, 0);
                (TLanes.Load(ref here, lanes) + t).Store(ref sum, lanes);
                (TLanes.Load(ref here, 2 * lanes) + s2).Store(ref sum, RowWidth);
                (TLanes.Load(ref here, 3 * lanes) + t2).Store(ref sum, RowWidth + lanes);
            }
        }
    }

    /// <summary>Sums over the k columns of the windows of row i, and from them means and squares.</summary>
    /// <param name="i">Row of the tile.</param>
    /// <param name="width">Windows.</param>
    /// <param name="pivot">The pivot.</param>
    /// <param name="inverses">1 / n.</param>
    /// <returns>False when a square is below its limit.</returns>
    public bool Moments<TLanes>(int i, int width, double pivot, ReadOnlySpan<double> inverses)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        ref double sums = ref MemoryMarshal.GetReference(columns[2 * i]), part = ref parts.First, rest = ref MemoryMarshal.GetReference(parts[2]);
        if (side > 8)
            Neighbours.Sum<TLanes, Neighbours.Eight>(ref sums, ref part, SumLength);
        switch (side % 8)
        {
            case 1:
                rest = ref sums;
                break;
            case 3:
                Neighbours.Sum<TLanes, Neighbours.Three>(ref sums, ref rest, SumLength);
                break;
            case 5:
                Neighbours.Sum<TLanes, Neighbours.Five>(ref sums, ref rest, SumLength);
                break;
            default:
                Neighbours.Sum<TLanes, Neighbours.Seven>(ref sums, ref rest, SumLength);
                break;
        }

        ref double inverse = ref MemoryMarshal.GetReference(inverses), moment = ref moments.First;
        TLanes p = TLanes.All(pivot), kept = TLanes.All(keptShare);
        bool allKept = true;
        nint eights = side & ~7;
        for (nint x = 0; x < width; x += TLanes.Count)
        {
            TLanes s = TLanes.Load(ref rest, x + eights), s2 = TLanes.Load(ref rest, x + eights + RowWidth);
            for (nint q = x; q < x + eights; q += 8)
            {
                s += TLanes.Load(ref part, q);
                s2 += TLanes.Load(ref part, q + RowWidth);
            }

            TLanes departure = s * TLanes.Load(ref inverse, x), square = s2 - (s * departure), limit = kept * s2;
            (p + departure).Store(ref moment, x);
            square.Store(ref moment, x + RegionWidth);
            limit.Store(ref moment, x + (2 * RegionWidth));
            allKept &= TLanes.AllAtLeast(square, limit);
        }

        return allKept;
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private static void Add<TLanes>(ref T samples, TLanes pivot, ref TLanes s, ref TLanes t, ref TLanes s2, ref TLanes t2)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        TLanes d = Load<TLanes>(ref samples, 0) - pivot, e = Load<TLanes>(ref samples, TLanes.Count) - pivot;
        s += d;
        t += e;
        s2 += d * d;
        t2 += e * e;
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private static TLanes Load<TLanes>(ref T start, nint offset)
        where TLanes : struct, IDoubleLanes<TLanes> =>
        typeof(T) == typeof(float) ? TLanes.Load(ref Unsafe.As<T, float>(ref start), offset) : TLanes.Load(ref Unsafe.As<T, double>(ref start), offset);
}
