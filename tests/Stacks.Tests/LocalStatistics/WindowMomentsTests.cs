using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.LocalStatistics;

/// <summary>
/// Means and sums of squared deviations of windows against their definition in whole numbers, which is exact: samples are
/// integers, and with n, s = sum v and q = sum v^2 of a window from summed-area tables, squares = (n q - s^2) / n.
/// </summary>
public class WindowMomentsTests
{
    private const SampleFlags Outsiders = SampleFlags.Missing | SampleFlags.Saturated;

    private static readonly int[] Widths = [8, 4, 2, 1];

    [Theory]
    [InlineData(3)]
    [InlineData(5)]
    [InlineData(7)]
    [InlineData(9)]
    [InlineData(15)]
    [InlineData(31)]
    public void They_are_exact_on_planes_of_every_size(int side)
    {
        for (int width = 1; width <= 70; width++)
        {
            for (int height = 1 + (width % 3); height <= 70; height += 3)
                Check<double>(new Scene(width, height, side, (100 * width) + height, (Kind)((width + height) % 5)));
        }
    }

    [Theory]
    [InlineData(3)]
    [InlineData(7)]
    [InlineData(13)]
    [InlineData(31)]
    [InlineData(33)]
    public void They_are_exact_over_several_tiles(int side)
    {
        foreach (Kind kind in Enum.GetValues<Kind>())
        {
            Scene scene = new(531, 80, side, 1, kind);
            Check<double>(scene);
            Check<float>(scene);
        }
    }

    [Fact]
    public void Bits_are_the_same_for_every_width_and_wherever_bands_are_cut()
    {
        foreach (int side in new[] { 3, 5, 7, 9, 11, 15, 31 })
        {
            foreach (Kind kind in Enum.GetValues<Kind>())
            {
                Scene scene = new(300, 45, side, 2, kind);
                (double[] means, double[] squares, double[] counts) = Compute<float>(scene, 8, [45]);
                foreach (int lanes in Widths)
                {
                    foreach (int[] cuts in new int[][] { [45], [1, 2, 17, 45], [22, 45], [7, 14, 21, 44, 45] })
                    {
                        (double[] m, double[] s, double[] n) = Compute<float>(scene, lanes, cuts);
                        Assert.Equal(means, m);
                        Assert.Equal(squares, s);
                        Assert.Equal(counts, n);
                    }
                }
            }
        }
    }

    [Fact]
    public void A_sample_leaves_no_trace_outside_of_its_windows()
    {
        const int width = 300, height = 40, side = 7, x = 140, y = 17;
        Random random = new(3);
        Plane<double> plane = FilterRun.PlaneOf(width, height, (_, _) => 1000 + (10 * random.NextDouble()));
        Plane<SampleFlags> flags = new(new SampleFlags[width * height], width, height);
        (double[] means, double[] squares, _) = Compute(plane, flags, SampleFlags.None, side, 8, [height]);
        plane[x, y] = 1e30;
        (double[] changedMeans, double[] changedSquares, _) = Compute(plane, flags, SampleFlags.None, side, 8, [height]);
        for (int i = 0; i < means.Length; i++)
        {
            bool within = Math.Abs((i % width) - x) <= side / 2 && Math.Abs((i / width) - y) <= side / 2;
            Assert.True(within ? changedMeans[i] > 1e27 : means[i].Equals(changedMeans[i]) && squares[i].Equals(changedSquares[i]), $"({i % width}, {i / width})");
        }
    }

    [Fact]
    public void Windows_of_equal_samples_have_no_variance_beside_any_other_level()
    {
        const int width = 300, height = 50;
        Plane<double> plane = FilterRun.PlaneOf(width, height, (x, y) => x < 130 ? 1234.567 : y < 20 ? -1e-3 : 7e9 / 3);
        Plane<SampleFlags> flags = new(new SampleFlags[width * height], width, height);
        foreach (int side in new[] { 3, 9, 31 })
        {
            (double[] means, double[] squares, _) = Compute(plane, flags, SampleFlags.None, side, 8, [height]);
            int checkedWindows = 0;
            for (int i = 0; i < means.Length; i++)
            {
                int x = i % width, y = i / width, r = side / 2;
                int left = Math.Max(0, x - r), right = Math.Min(width - 1, x + r), top = Math.Max(0, y - r), bottom = Math.Min(height - 1, y + r);
                if (plane[left, top] != plane[right, bottom] || plane[left, bottom] != plane[right, top] || plane[left, top] != plane[right, top])
                    continue;
                Assert.Equal(0, squares[i]);
                Assert.Equal(plane[x, y], means[i]);
                checkedWindows++;
            }

            Assert.True(checkedWindows > 5000);
        }
    }

    private static void Check<T>(Scene scene)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        (double[] means, double[] squares, double[] counts) = Compute<T>(scene, 8, [scene.Height]);
        for (int y = 0; y < scene.Height; y++)
        {
            for (int x = 0; x < scene.Width; x++)
            {
                int i = (y * scene.Width) + x;
                (long n, long sum, long squared) = scene.Window(x, y);
                bool takesPart = (scene.Flags[x, y] & Outsiders) == 0;
                if (counts[i] != (takesPart ? n : 0))
                    Assert.Fail($"{scene}: {counts[i]} samples at ({x}, {y}), should be {n}");
                if (!takesPart)
                    continue;

                double mean = (double)sum / n, square = (double)(((Int128)n * squared) - ((Int128)sum * sum)) / n;
                if (!(Math.Abs(means[i] - mean) <= 1e-15 * scene.Largest) || !(Math.Abs(squares[i] - square) <= 1e-8 * square))
                    Assert.Fail($"{scene}: mean {means[i]:R} and squares {squares[i]:R} at ({x}, {y}), should be {mean:R} and {square:R}");
            }
        }
    }

    private static (double[] Means, double[] Squares, double[] Counts) Compute<T>(Scene scene, int lanes, int[] cuts)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        Plane<T> plane = FilterRun.PlaneOf(scene.Width, scene.Height, (x, y) => (scene.Flags[x, y] & SampleFlags.Missing) != 0 ? T.NaN : T.CreateChecked(scene.Values[x, y]));
        return Compute(plane, scene.Flags, scene.Kind == Kind.Outsiders ? Outsiders : SampleFlags.None, scene.Side, lanes, cuts);
    }

    private static (double[] Means, double[] Squares, double[] Counts) Compute<T>(
        Plane<T> plane, Plane<SampleFlags> flags, SampleFlags without, int side, int lanes, int[] cuts)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        double[] means = new double[plane.Length], squares = new double[plane.Length], counts = new double[plane.Length];
        WindowMoments<T> moments = new(plane, flags, without, side, new Scratch()) { Lanes = lanes };
        int first = 0;
        foreach (int end in cuts)
        {
            moments.Rows(first, end, (x, y, m, s, n) =>
            {
                int place = (y * plane.Width) + x;
                m.CopyTo(means.AsSpan(place));
                s.CopyTo(squares.AsSpan(place));
                n.CopyTo(counts.AsSpan(place));
            });
            first = end;
        }

        // What stands in for moments of a pixel that takes no part is not compared.
        for (int i = 0; i < counts.Length; i++)
        {
            if (counts[i] == 0)
                means[i] = squares[i] = 0;
        }

        return (means, squares, counts);
    }

    private enum Kind
    {
        Noise,
        Pedestal,
        Step,
        Constant,
        Outsiders,
    }

    /// <summary>A plane of whole numbers and summed-area tables of its reflection, dcb|abcd|cba.</summary>
    private sealed class Scene
    {
        private readonly long[,] n, s, q;

        public Scene(int width, int height, int side, int seed, Kind kind)
        {
            (Width, Height, Side, Kind) = (width, height, side, kind);
            Random random = new(seed);
            int edge = random.Next(width);
            Values = FilterRun.PlaneOf(width, height, (x, _) => kind switch
            {
                Kind.Noise => random.Next(-500, 500),
                Kind.Pedestal => 10_000_000 + random.Next(-2, 3),
                Kind.Step => (x < edge ? 0 : 8_000_000) + random.Next(2),
                Kind.Constant => 9_999_999,
                _ => random.Next(60_000),
            });
            Flags = FilterRun.PlaneOf(width, height, (x, _) => kind == Kind.Outsiders && random.NextDouble() < (x < edge ? 0.02 : 0.5)
                ? (random.Next(2) == 0 ? SampleFlags.Missing : SampleFlags.Saturated)
                : SampleFlags.KeptAsSource);
            Largest = Values.Samples.ToArray().Max(v => Math.Abs((double)v));
            int columns = width + side, rows = height + side;
            (n, s, q) = (new long[columns, rows], new long[columns, rows], new long[columns, rows]);
            for (int y = 1; y < rows; y++)
            {
                for (int x = 1; x < columns; x++)
                {
                    int column = Reflect(x - 1 - (side / 2), width), row = Reflect(y - 1 - (side / 2), height);
                    long m = (Flags[column, row] & Outsiders) == 0 ? 1 : 0, v = Values[column, row];
                    n[x, y] = m + n[x - 1, y] + n[x, y - 1] - n[x - 1, y - 1];
                    s[x, y] = (m * v) + s[x - 1, y] + s[x, y - 1] - s[x - 1, y - 1];
                    q[x, y] = (m * v * v) + q[x - 1, y] + q[x, y - 1] - q[x - 1, y - 1];
                }
            }
        }

        public int Width { get; }

        public int Height { get; }

        public int Side { get; }

        public Kind Kind { get; }

        public Plane<int> Values { get; }

        public Plane<SampleFlags> Flags { get; }

        public double Largest { get; }

        public (long N, long Sum, long Squared) Window(int x, int y)
        {
            long Of(long[,] table) => table[x + Side, y + Side] - table[x, y + Side] - table[x + Side, y] + table[x, y];
            return (Of(n), Of(s), Of(q));
        }

        public override string ToString() => $"{Width} x {Height}, window {Side}, {Kind}";

        private static int Reflect(int index, int length)
        {
            while (length > 1 && (index < 0 || index >= length))
                index = index < 0 ? -index : (2 * (length - 1)) - index;
            return length == 1 ? 0 : index;
        }
    }
}
