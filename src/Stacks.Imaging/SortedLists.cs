namespace Stacks.Imaging;

/// <summary>
/// Sorting, merging and selecting with minima and maxima. Lists are values of a <see cref="MinMaxNetwork"/>; sorted ones
/// ascend.
/// </summary>
internal static class SortedLists
{
    /// <summary>Sorts by merging halves.</summary>
    public static int[] Sort(MinMaxNetwork network, ReadOnlySpan<int> list) => list.Length <= 1
        ? list.ToArray()
        : Merge(network, Sort(network, list[..((list.Length + 1) / 2)]), Sort(network, list[((list.Length + 1) / 2)..]));

    /// <summary>
    /// Merges two sorted lists: merges those of odd and those of even places, then compares neighbours (Batcher's
    /// odd-even merge; Knuth, The Art of Computer Programming 3, 5.3.4, for any two lengths).
    /// </summary>
    public static int[] Merge(MinMaxNetwork network, ReadOnlySpan<int> a, ReadOnlySpan<int> b)
    {
        if (a.Length == 0 || b.Length == 0)
            return [.. a, .. b];
        if (a.Length == 1 && b.Length == 1)
            return [network.Minimum(a[0], b[0]), network.Maximum(a[0], b[0])];
        int[] first = Merge(network, EverySecond(a, 0), EverySecond(b, 0));
        int[] second = Merge(network, EverySecond(a, 1), EverySecond(b, 1));
        List<int> merged = [first[0]];
        for (int i = 0; i < second.Length; i++)
        {
            if (i + 1 < first.Length)
            {
                merged.Add(network.Minimum(second[i], first[i + 1]));
                merged.Add(network.Maximum(second[i], first[i + 1]));
            }
            else
            {
                merged.Add(second[i]);
            }
        }

        merged.AddRange(first[Math.Min(first.Length, second.Length + 1)..]);
        return [.. merged];
    }

    /// <summary>
    /// The value of a rank (from 1) of two sorted lists together: the least, over all ways to take i of b and rank - i of
    /// a, of the higher of the two that were taken last.
    /// </summary>
    public static int Select(MinMaxNetwork network, ReadOnlySpan<int> a, ReadOnlySpan<int> b, int rank)
    {
        int? least = null;
        for (int i = Math.Max(0, rank - a.Length); i <= Math.Min(rank, b.Length); i++)
        {
            int last = i == 0 ? a[rank - 1] : i == rank ? b[i - 1] : network.Maximum(a[rank - i - 1], b[i - 1]);
            least = least is { } other ? network.Minimum(other, last) : last;
        }

        return least ?? throw new ArgumentOutOfRangeException(nameof(rank));
    }

    private static int[] EverySecond(ReadOnlySpan<int> list, int start)
    {
        List<int> taken = [];
        for (int i = start; i < list.Length; i += 2)
            taken.Add(list[i]);
        return [.. taken];
    }
}
