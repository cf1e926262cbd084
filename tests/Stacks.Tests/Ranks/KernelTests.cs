using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;
using Xunit;

namespace Stacks.Tests.Ranks;

/// <summary>
/// Every kernel variant (<see cref="WindowResults{T}.Variants"/>: networks interpreted and compiled at every vector width,
/// ordinals for large windows) against a scalar sort of each window, on planes of every kind and of every size from 1 x 1 to
/// 70 x 70, in memory whose next page cannot be read.
/// </summary>
public class KernelTests
{
    private static readonly double[] Probabilities = [0.25, 0.5, 0.75];

    /// <summary>Kinds of planes: what a sample is at a place.</summary>
    private static readonly Dictionary<string, Func<Random, int, int, double>> Kinds = new()
    {
        ["random"] = (random, _, _) => random.Next(30_000),
        ["ties"] = (random, _, _) => random.Next(5),
        ["constant"] = (_, _, _) => 1234,
        ["ramp along x"] = (_, x, _) => 100 * x,
        ["ramp along y"] = (_, _, y) => 100 * y,
        ["step"] = (random, x, y) => x + y > 40 ? 20_000 + random.Next(10) : 100 + random.Next(10),
        ["extreme"] = (random, _, _) => random.Next(4) switch { 0 => 1e38, 1 => -1e38, 2 => 0, _ => random.Next(100) },
    };

    public static TheoryData<int> Sides => [3, 5, 7, 9, 11, 15, 31, 33, 67];

    [Theory]
    [MemberData(nameof(Sides))]
    public void Unsigned_16_bit(int side) => Compare<ushort>(side);

    [Theory]
    [MemberData(nameof(Sides))]
    public void Signed_16_bit(int side) => Compare<short>(side);

    [Theory]
    [MemberData(nameof(Sides))]
    public void Float_32(int side) => Compare<float>(side);

    [Theory]
    [MemberData(nameof(Sides))]
    public void Float_64(int side) => Compare<double>(side);

    [Theory]
    [InlineData(5)]
    [InlineData(31)]
    public void Bands_give_the_same_bits(int side)
    {
        RankScene<float> scene = new(75, 130, 5, missing: 0.03);
        WindowQuantiles quantiles = new(side, Probabilities);
        WindowResults<float> whole = WindowResults<float>.Of(quantiles, scene.Rows(side / 2), LaneWidths.Widest, NetworkForm.Compiled, 130);
        foreach (int height in new[] { 1, 2, 7, 65 })
        {
            WindowResults<float> cut = WindowResults<float>.Of(quantiles, scene.Rows(side / 2), LaneWidths.Widest, NetworkForm.Compiled, height);
            Assert.Equal(whole.Counts, cut.Counts);
            for (int p = 0; p < Probabilities.Length; p++)
                Assert.Equal(whole.Values[p], cut.Values[p]);
        }
    }

    /// <summary>Every width with one height and every height with one width, kinds and holes in turn; all kinds on a few.</summary>
    private static void Compare<T>(int side)
        where T : unmanaged, INumber<T>
    {
        string[] kinds = [.. Kinds.Keys];
        double[] shares = [0, 0.001, 0.02, 0.3, 0.95];
        int turn = side;
        for (int size = 1; size <= 70; size++, turn++)
        {
            // Large windows are slow to sort: every seventh size for them.
            if (side > 9 && size % (side > 31 ? 23 : 7) != 1)
                continue;
            Compare<T>(side, size, 1 + (turn % 13), kinds[turn % kinds.Length], shares[turn % shares.Length]);
            Compare<T>(side, 1 + (turn % 11), size, kinds[(turn + 3) % kinds.Length], shares[(turn + 1) % shares.Length]);
        }

        foreach (string kind in kinds)
            Compare<T>(side, 70, side > 9 ? 12 : 70, kind, shares[turn++ % shares.Length]);
    }

    private static void Compare<T>(int side, int width, int height, string kind, double missing)
        where T : unmanaged, INumber<T>
    {
        Random random = new((side * 10007) + (width * 101) + height);
        using GuardedPlane<T> guarded = new(width, height);
        Assert.Equal(OperatingSystem.IsLinux(), guarded.IsGuarded);
        Plane<T> plane = guarded.Plane;
        Plane<SampleFlags> flags = new(new SampleFlags[plane.Length], width, height);
        for (int y = 0; y < height; y++)
        {
            for (int x = 0; x < width; x++)
            {
                plane[x, y] = T.CreateSaturating(Kinds[kind](random, x, y));
                if (random.NextDouble() < missing)
                {
                    flags[x, y] = SampleFlags.Missing;
                    plane[x, y] = T.CreateTruncating(double.NaN);
                }
            }
        }

        ReflectedRows<T> rows = new(plane, flags, SampleFlags.Missing, side / 2, new Scratch());
        WindowQuantiles quantiles = new(side, Probabilities);
        List<WindowResults<T>> all = [.. WindowResults<T>.AllForms(quantiles, rows)];
        for (int i = 0; i < width * height; i++)
        {
            List<T> sorted = Window(plane, flags, i % width, i / width, side);
            foreach (WindowResults<T> results in all)
            {
                string where = $"{kind}, {missing} missing, {width} x {height}, window {side}, ({i % width}, {i / width}), {results.Form}";
                Assert.True(sorted.Count == results.Counts[i], where);
                for (int p = 0; p < Probabilities.Length && sorted.Count > 0; p++)
                {
                    // Hyndman and Fan 1996, definition 7: x[j] + (h - j)(x[j+1] - x[j]), h = (n - 1) p, from the lowest as 0.
                    double h = (sorted.Count - 1) * Probabilities[p];
                    int j = (int)h;
                    T expected = sorted[j];
                    if (h > j)
                    {
                        double low = double.CreateChecked(sorted[j]), high = double.CreateChecked(sorted[j + 1]);
                        double exact = Math.Min(low + ((h - j) * (high - low)), high);
                        expected = T.CreateSaturating(T.One / (T.One + T.One) == T.Zero ? Math.Round(exact, MidpointRounding.ToEven) : exact);
                    }

                    if (results.Values[p][i] != expected)
                        Assert.Fail($"{where}, probability {Probabilities[p]}: {results.Values[p][i]}, expected {expected}");
                }
            }
        }
    }

    private static List<T> Window<T>(Plane<T> plane, Plane<SampleFlags> flags, int x, int y, int side)
        where T : unmanaged, INumber<T>
    {
        List<T> list = [];
        for (int j = y - (side / 2); j <= y + (side / 2); j++)
        {
            for (int i = x - (side / 2); i <= x + (side / 2); i++)
            {
                int column = RankScene<T>.Walk(i, plane.Width), row = RankScene<T>.Walk(j, plane.Height);
                if (flags[column, row] == 0)
                    list.Add(plane[column, row] + T.Zero);
            }
        }

        list.Sort();
        return list;
    }
}
