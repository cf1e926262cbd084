using System.Collections.Concurrent;

namespace Stacks.Imaging;

/// <summary>
/// Networks that find ranks of k x k windows, in two stages that share work between windows (after Adams, Fast median
/// filters using separable sorting networks, ACM Transactions on Graphics 40 (2021) 70). The first sorts each row of a
/// window, once for all windows that hold the row, and merges two neighbouring rows. The second serves two windows,
/// one row apart: the k - 1 rows they have in common, merged, are put together with the one row that only the upper or
/// the lower of them has, as far as the wanted ranks need it.
/// </summary>
internal static class WindowNetworks
{
    private static readonly ConcurrentDictionary<string, NetworkCode> Known = new();

    /// <summary>
    /// First stage. Pointers: 0, 1: the two image rows, from k / 2 left of the first window's centre; 2: the pair, whose
    /// rows are the k sorted samples of the upper image row, the k of the lower, and the 2 k of both.
    /// </summary>
    public static NetworkCode RowPair(int side) => Known.GetOrAdd($"row pair {side}", _ =>
    {
        MinMaxNetwork network = new();
        int[] upper = SortedLists.Sort(network, ImageRow(network, 0, side));
        int[] lower = SortedLists.Sort(network, ImageRow(network, 1, side));
        int row = 0;
        foreach (int value in (int[])[.. upper, .. lower, .. SortedLists.Merge(network, upper, lower)])
            network.Output(value, 2, row++);
        return new NetworkCode(network, 3);
    });

    /// <summary>
    /// Second stage. Pointers: 0 to k / 2 + 1: pairs of <see cref="RowPair"/>, downwards, the first holding in its lower
    /// row the upper window's first row; k / 2 + 2: the results, rows of the wanted ranks of the upper window, then of the
    /// lower.
    /// </summary>
    public static NetworkCode WindowPair(int side, ReadOnlySpan<int> ranks)
    {
        int[] wanted = ranks.ToArray();
        return Known.GetOrAdd($"window pair {side}: {string.Join(' ', wanted)}", _ =>
        {
            int radius = side / 2, results = radius + 2;
            MinMaxNetwork network = new();
            int[] common = MergeAll(network, [.. Enumerable.Range(1, radius).Select(pair => List(network, pair, 2 * side, 2 * side))]);
            int[] above = List(network, 0, side, side), below = List(network, radius + 1, 0, side);
            int row = 0;
            foreach (int[] own in new[] { above, below })
            {
                foreach (int rank in wanted)
                    network.Output(network.WithoutNegativeZero(SortedLists.Select(network, common, own, rank)), results, row++);
            }

            return new NetworkCode(network, results + 1);
        });
    }

    /// <summary>
    /// One window alone. Pointers: 0 to k - 1: the image rows, from k / 2 left of the window's centre; k: the results, a row
    /// for each wanted rank.
    /// </summary>
    public static NetworkCode Window(int side, ReadOnlySpan<int> ranks)
    {
        int[] wanted = ranks.ToArray();
        return Known.GetOrAdd($"window {side}: {string.Join(' ', wanted)}", _ =>
        {
            MinMaxNetwork network = new();
            int[] sorted = MergeAll(
                network, [.. Enumerable.Range(0, side).Select(row => SortedLists.Sort(network, ImageRow(network, row, side)))]);
            for (int i = 0; i < wanted.Length; i++)
                network.Output(network.WithoutNegativeZero(sorted[wanted[i] - 1]), side, i);
            return new NetworkCode(network, side + 1);
        });
    }

    private static int[] MergeAll(MinMaxNetwork network, ReadOnlySpan<int[]> lists) => lists.Length == 1
        ? lists[0]
        : SortedLists.Merge(
            network, MergeAll(network, lists[..((lists.Length + 1) / 2)]), MergeAll(network, lists[((lists.Length + 1) / 2)..]));

    private static int[] ImageRow(MinMaxNetwork network, int pointer, int side) =>
        [.. Enumerable.Range(0, side).Select(offset => network.Input(pointer, 0, offset))];

    private static int[] List(MinMaxNetwork network, int pointer, int row, int count) =>
        [.. Enumerable.Range(row, count).Select(r => network.Input(pointer, r, 0))];
}
