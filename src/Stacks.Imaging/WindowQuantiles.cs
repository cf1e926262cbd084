using System.Numerics;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>
/// Type-7 quantiles of k x k windows, exact; windows with samples that take no part have the quantiles of the others
/// (see <see cref="Quantile"/>).
/// </summary>
public sealed class WindowQuantiles
{
    /// <summary>Side of the largest window that networks are faster for.</summary>
    internal const int LargestNetwork = 9;

    private readonly double[] probabilities;

    /// <summary>Quantiles of the windows of one side.</summary>
    /// <param name="side">Side k, odd, 3 to 223.</param>
    /// <param name="probabilities">Probabilities in [0, 1], in the order of the results.</param>
    public WindowQuantiles(int side, params ReadOnlySpan<double> probabilities)
    {
        ArgumentOutOfRangeException.ThrowIfGreaterThan(side, OrdinalBlocks.MostSide);
        Side = side;
        this.probabilities = probabilities.ToArray();
        Full = new WindowRankTable(side * side, this.probabilities, 0);
        Holed = new WindowRankTable(side * side, this.probabilities, WindowRankTable.MostHoles);
    }

    /// <summary>Side k of the window.</summary>
    public int Side { get; }

    /// <summary>The probabilities, in the order of the results.</summary>
    public ReadOnlySpan<double> Probabilities => probabilities;

    /// <summary>Ranks that full windows need.</summary>
    internal WindowRankTable Full { get; }

    /// <summary>Ranks that windows with a few holes need too.</summary>
    internal WindowRankTable Holed { get; }

    /// <summary>Bytes that <c>Over</c> rents.</summary>
    public long ScratchBytes<T>()
        where T : unmanaged, INumber<T> => Side <= LargestNetwork ? NetworkBlocks.ScratchBytes<T>(this) : OrdinalBlocks.ScratchBytes<T>(this);

    /// <summary>The quantiles around the pixels of rows [first, end).</summary>
    /// <param name="rows">The plane; its radius is at least that of the window.</param>
    /// <param name="first">First row.</param>
    /// <param name="end">Row after the last.</param>
    /// <param name="scratch">Gives memory.</param>
    public QuantileBlocks<T> Over<T>(ReflectedRows<T> rows, int first, int end, IScratch scratch)
        where T : unmanaged, INumber<T> => Over(rows, first, end, scratch, LaneWidths.Widest, NetworkForm.Adaptive);

    /// <summary>The same with vectors of a width.</summary>
    internal QuantileBlocks<T> Over<T>(ReflectedRows<T> rows, int first, int end, IScratch scratch, LaneWidth width, NetworkForm form)
        where T : unmanaged, INumber<T> => Side <= LargestNetwork
            ? new NetworkBlocks<T>(this, rows, first, end, scratch, width, form)
            : new OrdinalBlocks<T>(this, rows, first, end, scratch);

    /// <summary>The quantiles of one window by sorting its samples: the slow form.</summary>
    /// <param name="rows">The plane.</param>
    /// <param name="x">Column of the centre.</param>
    /// <param name="y">Row of the centre.</param>
    /// <param name="gathered">Room for k * k samples.</param>
    /// <param name="results">Receives a quantile for each probability; nothing when no sample takes part.</param>
    /// <returns>Samples that take part.</returns>
    public int BySorting<T>(ReflectedRows<T> rows, int x, int y, Span<T> gathered, Span<T> results)
        where T : unmanaged, INumber<T>
    {
        Span<T> valid = gathered[..rows.Gather(x, y, Side / 2, gathered)];
        valid.Sort();
        for (int p = 0; p < probabilities.Length && valid.Length > 0; p++)
            results[p] = Quantile.OfSorted<T>(valid, probabilities[p]);
        return valid.Length;
    }
}
