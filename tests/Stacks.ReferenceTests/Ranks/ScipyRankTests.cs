using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Imaging;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Ranks;

/// <summary>
/// Ranks of windows 3 to 15 against scipy.ndimage.rank_filter on whole planes: its mode "mirror" is d c b | a b c d | c b a,
/// the border of METHODS 1, so the comparison does not stop at the interior. Quantiles of windows with holes against
/// numpy.quantile, method "linear" (type 7 of Hyndman and Fan).
/// </summary>
public class ScipyRankTests
{
    private const int Width = 61, Height = 43;

    [NeedsTheory(Needs.Scipy)]
    [InlineData("uint16")]
    [InlineData("int16")]
    [InlineData("float32")]
    [InlineData("float64")]
    public void Every_window_side_has_scipys_ranks(string type)
    {
        switch (type)
        {
            case "uint16":
                Compare(type, r => (ushort)r.Next(r.Next(2) == 0 ? 30 : 65536));
                break;
            case "int16":
                Compare(type, r => (short)r.Next(-32768, 32768));
                break;
            case "float32":
                Compare(type, r => (float)((r.NextDouble() * 2000) - 1000));
                break;
            default:
                Compare(type, r => (r.NextDouble() * 2000) - 1000);
                break;
        }
    }

    private static void Compare<T>(string type, Func<Random, T> sample)
        where T : unmanaged, System.Numerics.INumber<T>
    {
        using TemporaryFolder folder = new();
        Random random = new(1995);
        Plane<T> plane = FilterRun.PlaneOf(Width, Height, (_, _) => sample(random));
        Plane<SampleFlags> flags = new(new SampleFlags[plane.Length], Width, Height);
        ReflectedRows<T> rows = new(plane, flags, SampleFlags.Missing, 7, new Scratch());
        File.WriteAllBytes(folder.File("input"), MemoryMarshal.AsBytes(plane.Samples).ToArray());
        for (int side = 3; side <= 15; side += 2)
        {
            int n = side * side;
            int[] ranks = side <= 5 ? [.. Enumerable.Range(1, n)] : [1, 2, ((n - 1) / 4) + 1, (n + 1) / 2, n - ((n - 1) / 4), n - 1, n];
            T[] all = RanksByQuantiles(rows, side, ranks);
            File.WriteAllBytes(folder.File($"ranks-{side}"), MemoryMarshal.AsBytes(all.AsSpan()).ToArray());
        }

        ToolResult result = Tool.Run(Tool.Python, "-c", $"""
            import numpy, scipy.ndimage
            plane = numpy.fromfile(r'{folder.File("input")}', '{type}').reshape({Height}, {Width})
            for side in range(3, 16, 2):
                n = side * side
                ranks = range(1, n + 1) if side <= 5 else [1, 2, (n - 1) // 4 + 1, (n + 1) // 2, n - (n - 1) // 4, n - 1, n]
                ours = numpy.fromfile(r'{folder.File("ranks-")}' + str(side), '{type}').reshape(len(ranks), {Height}, {Width})
                for ours_of_rank, rank in zip(ours, ranks):
                    theirs = scipy.ndimage.rank_filter(plane, rank - 1, size=side, mode='mirror')
                    if not numpy.array_equal(ours_of_rank, theirs):
                        print('window', side, 'rank', rank, 'differs at', numpy.argwhere(ours_of_rank != theirs)[0])
            print('compared')
            """);
        Assert.Equal("compared", result.Output.Trim());
    }

    [NeedsFact(Needs.Scipy)]
    public void Windows_with_holes_have_numpys_quantiles()
    {
        using TemporaryFolder folder = new();
        Random random = new(7);
        Plane<double> plane = FilterRun.PlaneOf(Width, Height, (_, _) => random.NextDouble());
        Plane<SampleFlags> flags = FilterRun.PlaneOf(Width, Height, (_, _) => random.Next(3) == 0 ? SampleFlags.Missing : SampleFlags.None);
        ReflectedRows<double> rows = new(plane, flags, SampleFlags.Missing, 3, new Scratch());
        double[] all = Quantiles(rows, new WindowQuantiles(7, 0.1, 0.25, 0.5, 0.75));

        double[] holed = [.. Enumerable.Range(0, plane.Length).Select(i => flags.Buffer[i] == SampleFlags.None ? plane.Buffer[i] : double.NaN)];
        File.WriteAllBytes(folder.File("input"), MemoryMarshal.AsBytes(holed.AsSpan()).ToArray());
        File.WriteAllBytes(folder.File("ours"), MemoryMarshal.AsBytes(all.AsSpan()).ToArray());
        ToolResult result = Tool.Run(Tool.Python, "-c", $"""
            import numpy
            plane = numpy.pad(numpy.fromfile(r'{folder.File("input")}').reshape({Height}, {Width}), 3, mode='reflect')
            ours = numpy.fromfile(r'{folder.File("ours")}').reshape(4, {Height}, {Width})
            views = numpy.lib.stride_tricks.sliding_window_view(plane, (7, 7)).reshape({Height}, {Width}, 49)
            theirs = numpy.nanquantile(views, [0.1, 0.25, 0.5, 0.75], axis=2)
            print('%.3g' % numpy.abs(ours - theirs).max())
            """);
        Assert.InRange(double.Parse(result.Output, System.Globalization.CultureInfo.InvariantCulture), 0, 1e-15);
    }

    /// <summary>The quantile of probability (rank - 1) / (n - 1) is that rank.</summary>
    private static T[] RanksByQuantiles<T>(ReflectedRows<T> rows, int side, int[] ranks)
        where T : unmanaged, System.Numerics.INumber<T> =>
        Quantiles(rows, new WindowQuantiles(side, [.. ranks.Select(r => (r - 1.0) / ((side * side) - 1))]));

    private static T[] Quantiles<T>(ReflectedRows<T> rows, WindowQuantiles quantiles)
        where T : unmanaged, System.Numerics.INumber<T>
    {
        T[] all = new T[quantiles.Probabilities.Length * rows.Width * rows.Height];
        QuantileBlocks<T> blocks = quantiles.Over(rows, 0, rows.Height, new Scratch());
        while (blocks.Advance())
        {
            for (int row = 0; row < blocks.Height; row++)
            {
                for (int p = 0; p < quantiles.Probabilities.Length; p++)
                    blocks.Values(p, row).CopyTo(all.AsSpan((((p * rows.Height) + blocks.Y + row) * rows.Width) + blocks.X));
            }
        }

        return all;
    }
}
