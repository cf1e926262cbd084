namespace Stacks.Imaging;

/// <summary>
/// Comparators that bring wanted ranks of n samples to their places: place i and place j &gt; i become the lower and the
/// higher of the two. Batcher's merge exchange (Knuth, The Art of Computer Programming 3, 5.2.2, algorithm M), without
/// the comparators that no wanted rank depends on. The same comparators for every sample, so that lanes can be pixels.
/// </summary>
public sealed class RankNetwork
{
    private readonly int[] places;
    private readonly ushort[] comparators;

    /// <summary>The network of a number of samples and the ranks wanted of them.</summary>
    /// <param name="count">Samples, 1 to 65535.</param>
    /// <param name="ranks">Wanted ranks, 1 (lowest) to <paramref name="count"/>, in the order of the results.</param>
    /// <exception cref="ArgumentOutOfRangeException">A count or rank is out of range.</exception>
    public RankNetwork(int count, params ReadOnlySpan<int> ranks)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(count, 1);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(count, ushort.MaxValue);
        places = new int[ranks.Length];
        for (int i = 0; i < ranks.Length; i++)
        {
            ArgumentOutOfRangeException.ThrowIfLessThan(ranks[i], 1, nameof(ranks));
            ArgumentOutOfRangeException.ThrowIfGreaterThan(ranks[i], count, nameof(ranks));
            places[i] = ranks[i] - 1;
        }

        Count = count;
        comparators = Prune(MergeExchange(count), places, count);
    }

    /// <summary>Samples that go in.</summary>
    public int Count { get; }

    /// <summary>Place of each wanted rank after the comparators have run: rank - 1.</summary>
    internal ReadOnlySpan<int> Places => places;

    /// <summary>Pairs of places (lower, higher), one after the other.</summary>
    internal ReadOnlySpan<ushort> Comparators => comparators;

    private static List<(int Low, int High)> MergeExchange(int count)
    {
        List<(int, int)> list = [];
        int top = 1;
        while (2 * top < count)
            top *= 2;
        for (int p = top; p > 0; p /= 2)
        {
            int q = top, r = 0, d = p;
            while (true)
            {
                for (int i = 0; i + d < count; i++)
                {
                    if ((i & p) == r)
                        list.Add((i, i + d));
                }

                if (q == p)
                    break;
                d = q - p;
                q /= 2;
                r = p;
            }
        }

        return list;
    }

    private static ushort[] Prune(List<(int Low, int High)> all, int[] wanted, int count)
    {
        bool[] live = new bool[count];
        foreach (int place in wanted)
            live[place] = true;
        List<ushort> kept = [];
        for (int i = all.Count - 1; i >= 0; i--)
        {
            (int low, int high) = all[i];
            if (!live[low] && !live[high])
                continue;
            live[low] = live[high] = true;
            kept.Add((ushort)high);
            kept.Add((ushort)low);
        }

        kept.Reverse();
        return [.. kept];
    }
}
