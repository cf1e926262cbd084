using System.Numerics;
using System.Runtime.CompilerServices;

namespace Stacks.Imaging;

/// <summary>
/// Type-7 quantiles of k x k windows, exact: full windows by <see cref="WindowRanks"/>, windows with samples that take
/// no part by sorting the others, with the quantiles of their own count (see <see cref="Quantile"/>).
/// </summary>
public sealed class WindowQuantiles
{
    private const int Chunk = 64;

    private readonly double[] probabilities;
    private readonly (int Rank, double Fraction)[] positions;
    private readonly int[] firstResult;
    private readonly int rankCount;
    private readonly RankNetwork network;

    /// <summary>Quantiles of the windows of one side.</summary>
    /// <param name="side">Side k, odd, 1 or more.</param>
    /// <param name="probabilities">Probabilities in [0, 1], in the order of the results.</param>
    public WindowQuantiles(int side, params ReadOnlySpan<double> probabilities)
    {
        Side = side;
        this.probabilities = probabilities.ToArray();
        positions = Array.ConvertAll(this.probabilities, p => Quantile.Position(side * side, p));
        List<int> ranks = [];
        firstResult = Array.ConvertAll(positions, p =>
        {
            ranks.Add(p.Rank);
            if (p.Fraction > 0)
                ranks.Add(p.Rank + 1);
            return ranks.Count - (p.Fraction > 0 ? 2 : 1);
        });
        rankCount = ranks.Count;
        network = new RankNetwork(side * side, ranks.ToArray());
    }

    /// <summary>Side k of the window.</summary>
    public int Side { get; }

    /// <summary>Quantiles of the windows around pixels [first, end) of row <paramref name="y"/>.</summary>
    /// <param name="windows">The plane; its radius is at least that of the window.</param>
    /// <param name="y">Row.</param>
    /// <param name="first">First column.</param>
    /// <param name="end">Column after the last.</param>
    /// <param name="results">Receives, for each probability in turn, end - first samples; undefined where the count is 0.</param>
    /// <param name="counts">Receives how many samples took part in each window.</param>
    public void Row<T>(Windows<T> windows, int y, int first, int end, Span<T> results, Span<int> counts)
        where T : unmanaged, INumber<T> => Row(windows, y, first, end, results, counts, WindowRanks.Widest);

    /// <summary><see cref="Row{T}(Windows{T}, int, int, int, Span{T}, Span{int})"/> with vectors of at most a width.</summary>
    [SkipLocalsInit]
    internal void Row<T>(Windows<T> windows, int y, int first, int end, Span<T> results, Span<int> counts, LaneWidth width)
        where T : unmanaged, INumber<T>
    {
        int count = end - first, radius = Side / 2;
        Span<T> ranks = stackalloc T[rankCount * Chunk];
        Span<T> gathered = stackalloc T[network.Count];
        for (int x = first; x < end; x += Chunk)
        {
            int last = Math.Min(x + Chunk, end);
            WindowRanks.Row(windows, Side, network, y, x, last, ranks, width);
            FromRanks(ranks, last - x, results, x - first, count);
            counts[(x - first)..(last - first)].Fill(network.Count);
            if (windows.AllTakePartIn(x - radius, last + radius, y - radius, y + radius + 1))
                continue;
            for (int i = x; i < last; i++)
            {
                if (!windows.AllTakePartIn(i - radius, i + radius + 1, y - radius, y + radius + 1))
                    counts[i - first] = BySorting(windows, i, y, gathered, results[(i - first)..], count);
            }
        }
    }

    private void FromRanks<T>(ReadOnlySpan<T> ranks, int length, Span<T> results, int offset, int stride)
        where T : unmanaged, INumber<T>
    {
        for (int p = 0; p < positions.Length; p++)
        {
            ReadOnlySpan<T> low = ranks.Slice(firstResult[p] * length, length);
            Span<T> result = results.Slice((p * stride) + offset, length);
            if (positions[p].Fraction == 0)
            {
                low.CopyTo(result);
                continue;
            }

            ReadOnlySpan<T> high = ranks.Slice((firstResult[p] + 1) * length, length);
            for (int i = 0; i < length; i++)
                result[i] = Quantile.Between(low[i], high[i], positions[p].Fraction);
        }
    }

    private int BySorting<T>(Windows<T> windows, int x, int y, Span<T> gathered, Span<T> result, int stride)
        where T : unmanaged, INumber<T>
    {
        Span<T> valid = gathered[..windows.Gather(x, y, Side / 2, gathered)];
        valid.Sort();
        for (int p = 0; p < probabilities.Length && valid.Length > 0; p++)
            result[p * stride] = Quantile.OfSorted<T>(valid, probabilities[p]);
        return valid.Length;
    }
}
