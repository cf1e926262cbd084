using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>Q1, m, Q3 of the windows k = 3, 5, ... K, made ready once.</summary>
internal sealed class QuartileKernels
{
    /// <summary>The windows up to a side.</summary>
    public QuartileKernels(int largestWindow)
    {
        List<WindowQuantiles> quantiles = [];
        List<WindowRanks> ranks = [];
        for (int side = 3; side <= largestWindow; side += 2)
        {
            int n = side * side;
            quantiles.Add(new WindowQuantiles(side, 0.25, 0.5, 0.75));
            ranks.Add(new WindowRanks(side, ((n - 1) / 4) + 1, (n + 1) / 2, n - ((n - 1) / 4)));
        }

        Quantiles = quantiles;
        Ranks = ranks;
        FullRanges = [.. quantiles.Select(q => NormalOrderStatistics.InterquartileRange(q.Side * q.Side))];
    }

    /// <summary>For all pixels of a frame, smallest window first.</summary>
    public IReadOnlyList<WindowQuantiles> Quantiles { get; }

    /// <summary>For some pixels, smallest window first; n = k * k makes the quartiles ranks.</summary>
    public IReadOnlyList<WindowRanks> Ranks { get; }

    /// <summary>c(n) of full windows: the expected IQR of unit normal noise.</summary>
    public IReadOnlyList<double> FullRanges { get; }

    /// <summary>The smallest windows, which nearly every pixel needs.</summary>
    public int Shared => Math.Min(2, Quantiles.Count);

    /// <summary>Bytes that <see cref="QuartileWindows{T}"/> rents.</summary>
    public long ScratchBytes<T>()
        where T : unmanaged, INumber<T> =>
        Quantiles.Take(Shared).Sum(q => q.ScratchBytes<T>())
        + (Ranks.Count * 3L * WindowRanks.Pixels<T>() * Unsafe.SizeOf<T>())
        + ((long)Quantiles[^1].Side * Quantiles[^1].Side * Unsafe.SizeOf<T>());
}

/// <summary>Quartiles of one window.</summary>
/// <param name="Count">Samples that take part.</param>
/// <param name="Lower">Q1.</param>
/// <param name="Median">m.</param>
/// <param name="Upper">Q3.</param>
internal readonly record struct Quartiles(int Count, double Lower, double Median, double Upper)
{
    /// <summary>IQR.</summary>
    public double Range => Upper - Lower;
}

/// <summary>
/// Quartiles around the pixels of a band of rows, block by block: the smallest windows for every pixel, larger ones for
/// the few that ask, a vector of neighbours at a time since those often ask next.
/// </summary>
internal sealed class QuartileWindows<T>
    where T : unmanaged, INumber<T>
{
    private readonly QuartileKernels kernels;
    private readonly ReflectedRows<T> rows;
    private readonly QuantileBlocks<T>[] shared;
    private readonly T[][] alone;
    private readonly (int X, int Y)[] aloneAt;
    private readonly T[] gathered;

    /// <summary>The windows of rows [first, end).</summary>
    public QuartileWindows(QuartileKernels kernels, ReflectedRows<T> rows, int first, int end, IScratch scratch)
    {
        this.kernels = kernels;
        this.rows = rows;
        shared = [.. kernels.Quantiles.Take(kernels.Shared).Select(q => q.Over(rows, first, end, scratch))];
        alone = [.. kernels.Ranks.Select(_ => scratch.Rent<T>(3 * WindowRanks.Pixels<T>(), 1).Buffer)];
        aloneAt = [.. kernels.Ranks.Select(_ => (-1, -1))];
        gathered = scratch.Rent<T>(kernels.Quantiles[^1].Side, kernels.Quantiles[^1].Side).Buffer;
    }

    /// <summary>How many windows there are.</summary>
    public int Count => kernels.Quantiles.Count;

    /// <summary>Samples of a full window.</summary>
    public int FullCount(int window) => kernels.Quantiles[window].Side * kernels.Quantiles[window].Side;

    /// <summary>Expected IQR of unit normal noise in a full window.</summary>
    public double FullRange(int window) => kernels.FullRanges[window];

    /// <summary>First column of the block.</summary>
    public int X => shared[0].X;

    /// <summary>First row of the block.</summary>
    public int Y => shared[0].Y;

    /// <summary>Columns of the block.</summary>
    public int Width => shared[0].Width;

    /// <summary>Rows of the block.</summary>
    public int Height => shared[0].Height;

    /// <summary>Computes the next block; false when there is none left.</summary>
    public bool Advance()
    {
        bool more = true;
        foreach (QuantileBlocks<T> blocks in shared)
            more &= blocks.Advance();
        return more;
    }

    /// <summary>The quartiles of a shared window around the pixels of a row of the block.</summary>
    public QuantileBlocks<T> Shared(int window) => shared[window];

    /// <summary>The quartiles of a window around column <see cref="X"/> + <paramref name="i"/> of a row of the block.</summary>
    public Quartiles At(int window, int i, int row)
    {
        if (window < shared.Length)
        {
            QuantileBlocks<T> blocks = shared[window];
            return Of(blocks.Counts(row)[i], blocks.Values(0, row)[i], blocks.Values(1, row)[i], blocks.Values(2, row)[i]);
        }

        int x = X + i, y = Y + row, side = kernels.Ranks[window].Side, pixels = WindowRanks.Pixels<T>();
        if (!rows.AllTakePartIn(x, y, side / 2))
        {
            Span<T> found = stackalloc T[3];
            int count = kernels.Quantiles[window].BySorting(rows, x, y, gathered, found);
            return Of(count, found[0], found[1], found[2]);
        }

        int start = x / pixels * pixels;
        if (aloneAt[window] != (start, y))
        {
            kernels.Ranks[window].At<T>(rows, start, y, alone[window]);
            aloneAt[window] = (start, y);
        }

        T[] results = alone[window];
        return Of(side * side, results[x - start], results[pixels + x - start], results[(2 * pixels) + x - start]);
    }

    private static Quartiles Of(int count, T lower, T median, T upper) =>
        new(count, double.CreateTruncating(lower), double.CreateTruncating(median), double.CreateTruncating(upper));
}
