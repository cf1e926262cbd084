using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>Receives the moments of the windows around neighbouring pixels of a row.</summary>
/// <param name="x">Column of the first.</param>
/// <param name="y">Row.</param>
/// <param name="means">Means, one for each column from <paramref name="x"/> on.</param>
/// <param name="squares">Sums of squared deviations from them; the sample variance is this / (n - 1).</param>
/// <param name="counts">n: samples that take part; 0 where the pixel itself does not, and its moments mean nothing.</param>
public delegate void MomentsOfRow(int x, int y, ReadOnlySpan<double> means, ReadOnlySpan<double> squares, ReadOnlySpan<double> counts);

/// <summary>What <see cref="WindowMoments{T}"/> takes.</summary>
public static class WindowMoments
{
    /// <summary>Bytes that one band of rows rents.</summary>
    /// <param name="side">k.</param>
    public static long ScratchBytes<T>(int side)
        where T : unmanaged =>
        WindowSums<T>.ScratchBytes(side) + WindowCounts.ScratchBytes(side, WindowSums<T>.RegionWidth) + (Unsafe.SizeOf<T>() * ((2L * side) - 1) * WindowSums<T>.RegionWidth);
}

/// <summary>
/// Mean and sum of squared deviations of the k x k window around every pixel, in a time that hardly depends on k.
/// The frame is worked in tiles at fixed places, k rows high. A tile has a pivot p among its own samples, and with
/// d = v - p, S1 = sum d, S2 = sum d^2 over the n samples of a window: mean = p + S1 / n, squares = S2 - S1^2 / n
/// (shifted data: Chan, Golub and LeVeque, The American Statistician 37 (1983) 242). Sums over k rows are the end of one
/// block of k rows and the start of the next (van Herk, Pattern Recognition Letters 13 (1992) 517; Gil and Werman, IEEE
/// Trans. PAMI 15 (1993) 504), sums over k columns are put together from sums over 8 and over the rest: nothing is ever
/// subtracted, so that a sample outside of a window leaves no trace in it. Where S2 - S1^2 / n loses more than
/// <see cref="LostBits"/> bits, because the pivot is far from the window's samples, the window is summed in two passes.
/// </summary>
/// <typeparam name="T">float or double.</typeparam>
/// <param name="plane">v.</param>
/// <param name="flags">What is known of each sample; same shape.</param>
/// <param name="without">Samples with any of these flags take no part; <see cref="SampleFlags.None"/> where no sample of the plane has one.</param>
/// <param name="side">k, odd, 3 to 63.</param>
/// <param name="scratch">Gives the memory.</param>
public sealed class WindowMoments<T>(Plane<T> plane, Plane<SampleFlags> flags, SampleFlags without, int side, IScratch scratch)
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    /// <summary>Bits that a sum of squares may lose of its 53 before it is computed anew.</summary>
    private const int LostBits = 20;

    private readonly int radius = side / 2;

    /// <summary>Lanes to compute with; results are the same bits.</summary>
    public int Lanes { get; init; } = DoubleLanes.Widest;

    /// <summary>Computes the rows [first, end). Safe to call for several bands at once.</summary>
    /// <param name="first">First row.</param>
    /// <param name="end">Row after the last.</param>
    /// <param name="receive">Gets every pixel of the rows once, a part of a row at a time.</param>
    public void Rows(int first, int end, MomentsOfRow receive)
    {
        switch (Lanes)
        {
            case 8:
                Rows<DoubleLanes512>(first, end, receive);
                break;
            case 4:
                Rows<DoubleLanes256>(first, end, receive);
                break;
            case 2:
                Rows<DoubleLanes128>(first, end, receive);
                break;
            default:
                Rows<DoubleLane>(first, end, receive);
                break;
        }
    }

    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private void Rows<TLanes>(int first, int end, MomentsOfRow receive)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        WindowSums<T> sums = new(side, LostBits, scratch);
        WindowCounts counts = new(side, WindowSums<T>.RegionWidth, without, scratch);
        Plane<T> copy = scratch.Rent<T>(WindowSums<T>.RegionWidth, (2 * side) - 1);
        for (int top = first - (first % side); top < end; top += side)
        {
            for (int left = 0; left < plane.Width; left += sums.Width)
            {
                int width = Math.Min(sums.Width, plane.Width - left), x = left - radius, y = top - radius;
                T pivot = Pivot(left, top, width);
                counts.LookUp(flags, x, y, width + (2 * radius));
                bool direct = counts.AllTakePart && x >= 0 && y >= 0 && x + copy.Width <= plane.Width && y + copy.Height <= plane.Height;
                if (!direct)
                    Copy(x, y, width + (2 * radius), pivot, counts, copy);
                ref T source = ref direct ? ref plane[x, y] : ref copy[0, 0];
                nint stride = direct ? plane.Width : copy.Width;
                double p = double.CreateTruncating(pivot);
                sums.SumRows<TLanes>(ref source, stride, p);
                for (int i = 0; i < side && top + i < end; i++)
                {
                    counts.CountRow(i);
                    if (top + i < first)
                        continue;
                    if (!sums.Moments<TLanes>(i, width, p, counts.Inverses))
                        SumAgain(left, top + i, sums.Means[..width], sums.Squares, sums.Limits, counts.Counts);
                    receive(left, top + i, sums.Means[..width], sums.Squares[..width], counts.Counts[..width]);
                }
            }
        }
    }

    /// <summary>The median of three samples of the tile at fixed places, which one outlier does not move; else its first that takes part; 0 where none does.</summary>
    private T Pivot(int left, int top, int width)
    {
        int below = Math.Min(top + side, plane.Height) - 1, right = left + width - 1;
        if (TakesPart(left, top) && TakesPart(left + (width / 2), below) && TakesPart(right, top))
        {
            T a = plane[left, top], b = plane[left + (width / 2), below], c = plane[right, top];
            return T.Max(T.Min(a, b), T.Min(T.Max(a, b), c));
        }

        for (int y = top; y < Math.Min(top + side, plane.Height); y++)
        {
            for (int x = left; x < left + width; x++)
            {
                if (TakesPart(x, y))
                    return plane[x, y];
            }
        }

        return T.Zero;
    }

    /// <summary>Copies samples from (x, y) on with reflected borders; those that take no part, and columns from the width on, become the pivot.</summary>
    private void Copy(int x, int y, int width, T pivot, WindowCounts counts, Plane<T> copy)
    {
        for (int j = 0; j < copy.Height; j++)
        {
            ReadOnlySpan<T> row = plane.Row(Reflection.Index(y + j, plane.Height));
            Span<T> samples = copy.Row(j);
            int before = Math.Max(0, -x), end = Math.Min(width, plane.Width - x);
            row[(x + before)..(x + end)].CopyTo(samples[before..]);
            for (int i = 0; i < before; i++)
                samples[i] = row[Reflection.Index(x + i, row.Length)];
            for (int i = end; i < width; i++)
                samples[i] = row[Reflection.Index(x + i, row.Length)];
            samples[width..].Fill(pivot);
            foreach (ushort outsider in counts.OutsidersOf(j))
                samples[outsider] = pivot;
        }
    }

    /// <summary>The definition in two passes, mean = v_p + sum (v_q - v_p) / n and squares = sum (v_q - mean)^2, where squares are below their limit.</summary>
    private void SumAgain(int left, int y, Span<double> means, Span<double> squares, ReadOnlySpan<double> limits, ReadOnlySpan<double> counts)
    {
        for (int i = 0; i < means.Length; i++)
        {
            if (squares[i] >= limits[i] || counts[i] == 0)
                continue;
            double own = double.CreateTruncating(plane[left + i, y]), departure = 0, square = 0;
            for (int q = 0; q < side * side; q++)
            {
                if (Neighbour(left + i, y, q) is { } v)
                    departure += v - own;
            }

            double mean = own + (departure / counts[i]);
            for (int q = 0; q < side * side; q++)
            {
                if (Neighbour(left + i, y, q) is { } v)
                    square += (v - mean) * (v - mean);
            }

            means[i] = mean;
            squares[i] = square;
        }
    }

    /// <summary>Sample q of the window around (x, y), row after row; null where it takes no part.</summary>
    private double? Neighbour(int x, int y, int q)
    {
        int column = Reflection.Index(x - radius + (q % side), plane.Width), row = Reflection.Index(y - radius + (q / side), plane.Height);
        return TakesPart(column, row) ? double.CreateTruncating(plane[column, row]) : null;
    }

    private bool TakesPart(int x, int y) => without == 0 || (flags[x, y] & without) == 0;
}
