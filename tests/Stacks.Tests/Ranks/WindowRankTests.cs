using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;
using Xunit;

namespace Stacks.Tests.Ranks;

/// <summary>Every rank and quartile of every window side from 3 to 15 against a scalar sort, at every vector width.</summary>
public class WindowRankTests
{
    private static readonly int[] Sides = [1, 2, 3, 4, 5, 7, 8, 9, 15, 16, 17, 31, 32, 33, 40];

    private static IEnumerable<LaneWidth> Widths => Enum.GetValues<LaneWidth>().Where(w => w <= WindowRanks.Widest);

    public static TheoryData<int> Windows => [3, 5, 7, 9, 11, 13, 15];

    [Theory]
    [MemberData(nameof(Windows))]
    public void Every_rank_of_unsigned_16_bit(int side) => EveryRank<ushort>(side);

    [Theory]
    [MemberData(nameof(Windows))]
    public void Every_rank_of_signed_16_bit(int side) => EveryRank<short>(side);

    [Theory]
    [MemberData(nameof(Windows))]
    public void Every_rank_of_float_32(int side) => EveryRank<float>(side);

    [Theory]
    [MemberData(nameof(Windows))]
    public void Every_rank_of_float_64(int side) => EveryRank<double>(side);

    private static void EveryRank<T>(int side)
        where T : unmanaged, INumber<T>
    {
        int n = side * side;
        RankNetwork all = new(n, [.. Enumerable.Range(1, n)]);
        foreach ((int width, int height) in Shapes())
        {
            RankScene<T> scene = new(width, height, (side * 10007) + (width * 101) + height);
            Windows<T> windows = scene.Windows(side / 2);
            T[] results = new T[n * width];
            for (int y = 0; y < height; y += 1 + (height / 8))
            {
                List<T>[] expected = [.. Enumerable.Range(0, width).Select(x => scene.Sorted(x, y, side))];
                foreach (LaneWidth lanes in Widths)
                {
                    WindowRanks.Row(windows, side, all, y, 0, width, results, lanes);
                    for (int x = 0; x < width; x++)
                    {
                        for (int r = 0; r < n; r++)
                        {
                            if (!SameBits(expected[x][r], results[(r * width) + x]))
                                Assert.Fail($"{width} x {height}, window {side}, ({x}, {y}), rank {r + 1}, {lanes}: {results[(r * width) + x]}, expected {expected[x][r]}");
                        }
                    }
                }
            }
        }
    }

    [Theory]
    [MemberData(nameof(Windows))]
    public void Quartiles_stand_at_their_exact_ranks(int side)
    {
        // METHODS: Q1 = rank (n-1)/4 + 1, median = rank (n+1)/2, Q3 = rank n - (n-1)/4 of a full window.
        int n = side * side;
        RankScene<ushort> scene = new(70, 19, side);
        Windows<ushort> windows = scene.Windows(side / 2);
        WindowQuantiles quartiles = new(side, 0.25, 0.5, 0.75);
        ushort[] results = new ushort[3 * 70];
        int[] counts = new int[70];
        for (int y = 0; y < 19; y++)
        {
            foreach (LaneWidth lanes in Widths)
            {
                quartiles.Row(windows, y, 0, 70, results, counts, lanes);
                for (int x = 0; x < 70; x++)
                {
                    List<ushort> sorted = scene.Sorted(x, y, side);
                    Assert.Equal(sorted[((n - 1) / 4) + 1 - 1], results[x]);
                    Assert.Equal(sorted[((n + 1) / 2) - 1], results[70 + x]);
                    Assert.Equal(sorted[n - ((n - 1) / 4) - 1], results[140 + x]);
                    Assert.Equal(n, counts[x]);
                }
            }
        }
    }

    [Fact]
    public void Parts_of_a_row_are_what_the_whole_row_is()
    {
        RankScene<ushort> scene = new(83, 5, 1);
        Windows<ushort> windows = scene.Windows(2);
        RankNetwork network = new(25, 7, 13);
        ushort[] whole = new ushort[2 * 83];
        WindowRanks.Row(windows, 5, network, 2, 0, 83, whole);
        for (int first = 0; first < 83; first += 5)
        {
            for (int end = first + 1; end <= 83; end += 3)
            {
                ushort[] part = new ushort[2 * (end - first)];
                WindowRanks.Row(windows, 5, network, 2, first, end, part);
                Assert.Equal(whole[first..end], part[..(end - first)]);
                Assert.Equal(whole[(83 + first)..(83 + end)], part[(end - first)..]);
            }
        }
    }

    [Fact]
    public void Networks_of_3_x_3_find_every_rank_of_every_order()
    {
        // Zero-one principle (Knuth, The Art of Computer Programming 3, 5.3.4): a network that finds a rank of all
        // sequences of zeros and ones finds it of all sequences. For 9 samples these are 512.
        for (int rank = 1; rank <= 9; rank++)
        {
            RankNetwork network = new(9, rank);
            for (int pattern = 0; pattern < 512; pattern++)
                Assert.Equal(BitOperations.PopCount((uint)pattern) > 9 - rank ? 1 : 0, Apply(network, i => (ushort)((pattern >> i) & 1), 3)[0]);
        }
    }

    [Theory]
    [MemberData(nameof(Windows))]
    public void Pruned_networks_find_each_rank(int side)
    {
        int n = side * side;
        Random random = new(side);
        int[] order = [.. Enumerable.Range(1, n)];
        foreach (int rank in Enumerable.Range(1, n).Where(r => n < 60 || r % 7 == 1 || r >= n - 1))
        {
            RankNetwork network = new(n, rank);
            for (int round = 0; round < 8; round++)
            {
                random.Shuffle(order);
                Assert.Equal(rank, Apply(network, i => (ushort)order[i], side)[0]);
            }
        }
    }

    [Fact]
    public void Negative_zero_counts_as_zero()
    {
        Plane<double> plane = new([-0.0, 0.0, -0.0, 0.0], 4, 1);
        Windows<double> windows = Imaging.Windows.Of(
            plane, new Plane<SampleFlags>(new SampleFlags[4], 4, 1), SampleFlags.Missing, 1, new Scratch(), SerialBands.Instance);
        double[] result = new double[4];
        WindowRanks.Row(windows, 3, new RankNetwork(9, 1), 0, 0, 4, result);
        Assert.All(result, v => Assert.False(double.IsNegative(v)));
    }

    private static ushort[] Apply(RankNetwork network, Func<int, ushort> sample, int side)
    {
        Plane<ushort> plane = new([.. Enumerable.Range(0, side * side).Select(sample)], side, side);
        Windows<ushort> windows = Imaging.Windows.Of(
            plane, new Plane<SampleFlags>(new SampleFlags[side * side], side, side), SampleFlags.Missing, side / 2, new Scratch(), SerialBands.Instance);
        ushort[] result = new ushort[1];
        WindowRanks.Row(windows, side, network, side / 2, side / 2, (side / 2) + 1, result, LaneWidth.Single);
        return result;
    }

    /// <summary>Every width with a few heights and every height with a few widths.</summary>
    private static IEnumerable<(int Width, int Height)> Shapes()
    {
        foreach (int a in Sides)
        {
            foreach (int b in Sides.Where(b => a == b || b is 1 or 2 or 17))
            {
                yield return (a, b);
                if (a != b)
                    yield return (b, a);
            }
        }
    }

    private static bool SameBits<T>(T a, T b)
        where T : unmanaged, INumber<T> => a == b && T.IsNegative(a) == T.IsNegative(b);
}
