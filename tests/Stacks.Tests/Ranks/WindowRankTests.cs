using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;
using Xunit;

namespace Stacks.Tests.Ranks;

/// <summary>Every rank and quartile of every window side from 3 to 15 against a scalar sort, at every vector width.</summary>
public class WindowRankTests
{
    private static readonly int[] Sides = [1, 2, 3, 4, 5, 7, 8, 9, 15, 16, 17, 31, 32, 33, 40];

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
        int n = side * side, pixels = WindowRanks.Pixels<T>();
        WindowRanks all = new(side, [.. Enumerable.Range(1, n)]);
        T[] results = new T[n * pixels];
        foreach ((int width, int height) in Shapes())
        {
            RankScene<T> scene = new(width, height, (side * 10007) + (width * 101) + height);
            ReflectedRows<T> rows = scene.Rows(side / 2);
            for (int y = 0; y < height; y += 1 + (height / 8))
            {
                List<T>[] expected = [.. Enumerable.Range(0, width).Select(x => scene.Sorted(x, y, side))];
                foreach ((LaneWidth lanes, NetworkForm form) in WindowResults<T>.Variants.Where(v => side <= 5 || v.Form == NetworkForm.Interpreted))
                {
                    for (int first = 0; first < width; first += pixels)
                    {
                        all.At(rows, first, y, results, lanes, form);
                        for (int x = first; x < Math.Min(width, first + pixels); x++)
                        {
                            for (int r = 0; r < n; r++)
                            {
                                T found = results[(r * pixels) + x - first];
                                if (!SameBits(expected[x][r], found))
                                    Assert.Fail($"{width} x {height}, window {side}, ({x}, {y}), rank {r + 1}, {lanes}, {form}: {found}, expected {expected[x][r]}");
                            }
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
        int[] ranks = [((n - 1) / 4) + 1, (n + 1) / 2, n - ((n - 1) / 4)];
        RankScene<ushort> scene = new(70, 19, side);
        foreach (WindowResults<ushort> results in WindowResults<ushort>.AllForms(new WindowQuantiles(side, 0.25, 0.5, 0.75), scene.Rows(side / 2)))
        {
            for (int i = 0; i < 70 * 19; i++)
            {
                List<ushort> sorted = scene.Sorted(i % 70, i / 70, side);
                for (int p = 0; p < 3; p++)
                    Assert.Equal(sorted[ranks[p] - 1], results.Values[p][i]);
                Assert.Equal(n, results.Counts[i]);
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
            WindowRanks network = new(3, rank);
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
            WindowRanks network = new(side, rank);
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
        ReflectedRows<double> rows = new(plane, new Plane<SampleFlags>(new SampleFlags[4], 4, 1), SampleFlags.Missing, 2, new Scratch());
        double[] result = new double[WindowRanks.Pixels<double>()];
        new WindowRanks(3, 1).At(rows, 0, 0, result);
        Assert.All(result, v => Assert.False(double.IsNegative(v)));
        foreach (WindowResults<double> results in WindowResults<double>.AllForms(new WindowQuantiles(5, 0, 0.3, 0.5, 1), rows))
            Assert.All(results.Values, values => Assert.All(values, v => Assert.False(double.IsNegative(v))));
    }

    private static ushort[] Apply(WindowRanks network, Func<int, ushort> sample, int side)
    {
        Plane<ushort> plane = new([.. Enumerable.Range(0, side * side).Select(sample)], side, side);
        ReflectedRows<ushort> rows = new(plane, new Plane<SampleFlags>(new SampleFlags[side * side], side, side), SampleFlags.Missing, side / 2, new Scratch());
        ushort[] result = new ushort[WindowRanks.Pixels<ushort>()];
        network.At(rows, side / 2, side / 2, result, LaneWidth.Single, NetworkForm.Interpreted);
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
