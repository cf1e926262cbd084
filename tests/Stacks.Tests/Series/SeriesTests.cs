using System.Text.Json;
using Stacks.Abstractions;
using Stacks.Pipeline;
using Stacks.Tests.Cli;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Series;

/// <summary>Folders and patterns: the files they name, in which order, as one stack and as many.</summary>
public sealed class SeriesTests : IDisposable
{
    private readonly CliBench bench = new();
    private readonly PluginCatalogue catalogue = PluginCatalogue.Load(Path.GetDirectoryName(Checkout.Host)!, []);

    public void Dispose() => bench.Dispose();

    [Fact]
    public void Natural_order_by_hand()
    {
        string[] expected = ["", "a", "a0", "a00", "A1", "a1b", "a01b", "a2", "A10", "a10", "a10.5", "a10.10", "a99999999999999999999998", "a99999999999999999999999", "b", "frame2.fits", "Frame3.fits", "frame10.fits", "ö1"];
        for (int seed = 0; seed < 20; seed++)
        {
            string[] mixed = [.. expected];
            new Random(seed).Shuffle(mixed);
            Assert.Equal(expected, mixed.Order(NaturalOrder.Instance));
        }
    }

    [Fact]
    public void A_folder_names_its_stacks_and_nothing_else()
    {
        foreach (string name in new[] { "night/f10.fits", "night/f9.fits", "night/F2.fits", "night/.hidden.fits", "night/f1.fits.partial", "night/deep/f3.fits" })
            bench.Stack(name);
        bench.Put("night/notes.txt", "clouds after two");
        bench.Put("night/empty.fits", "");
        bench.Put("night/c.changes.tif", SmallFiles.Tiff(8));
        bench.Put("night/c.tif.prov.json", """{ "entity": { "stacks:companion1": { "prov:label": "c.changes.tif" } } }""");

        InputSet folder = Assert.Single(InputFiles.Of([bench.File("night")], catalogue));
        Assert.Equal((true, 2), (folder.IsSeries, folder.Skipped));
        Assert.Equal(["F2.fits", "f9.fits", "f10.fits"], folder.Files.Select(Path.GetFileName));
        Assert.Equal(["f9.fits", "f10.fits"], InputFiles.Of([bench.File("night/f*.fits")], catalogue)[0].Files.Select(Path.GetFileName));
        Assert.Equal(["f9.fits"], InputFiles.Of([bench.File("night/?9.fits")], catalogue)[0].Files.Select(Path.GetFileName));

        InputSet one = InputFiles.Of([bench.File("night/none.fits")], catalogue)[0];
        Assert.Equal((false, bench.File("night/none.fits")), (one.IsSeries, one.Files[0]));
    }

    [Fact]
    public void A_run_makes_an_output_for_each_file_and_does_not_eat_its_own()
    {
        bench.Stack("night/f10.fits");
        bench.Stack("night/f9.fits");
        bench.Put("night/notes.txt", "clouds");
        string recipe = bench.Recipe();

        for (int time = 0; time < 2; time++)
        {
            ToolResult result = Tool.Stacks("run", recipe, bench.File("night"), "-o", bench.File("night/clean"));
            Assert.Equal(0, result.ExitCode);
            Assert.Contains("2 stacks; 1 other file not taken", result.Error, StringComparison.Ordinal);
            Assert.Contains(time == 0 ? "2 stacks: 2 made, 0 done before, 0 failed" : "2 stacks: 0 made, 2 done before, 0 failed", result.Output, StringComparison.Ordinal);
            Assert.True(result.Output.IndexOf("f9.fits", StringComparison.Ordinal) < result.Output.IndexOf("f10.fits", StringComparison.Ordinal));
        }

        Assert.Equal(["f10.fits", "f10.fits.prov.json", "f9.fits", "f9.fits.prov.json"], Directory.GetFiles(bench.File("night/clean")).Select(Path.GetFileName).Order(StringComparer.Ordinal));
    }

    [Fact]
    public void A_folder_without_stacks_and_a_pattern_that_fits_none_are_missing_inputs()
    {
        bench.Put("night/notes.txt", "clouds");

        bench.Refused(bench.Run(bench.Recipe(), bench.File("night")), 66, "names no stack");
        bench.Refused(bench.Run(bench.Recipe(), bench.File("night/*.fits")), 66, "names no stack");
        bench.Refused(bench.Run(bench.Recipe(), bench.File("day/*.fits")), 66, "no folder");
    }

    /// <summary>Frames by number and from many threads, over more files than are open at a time.</summary>
    [Fact]
    public void Many_files_are_one_stack()
    {
        string[] files = [.. Enumerable.Range(0, 30).Select(i => bench.Put($"s/f{i}.fits", SmallFiles.Fits(5, 4, 1 + (i % 3), (x, y, f) => (1000 * i) + (100 * f) + (10 * y) + x)))];
        using StackSeries series = new("s", files, catalogue, new ReadOptions());

        (int File, int Frame)[] frames = [.. from i in Enumerable.Range(0, 30) from f in Enumerable.Range(0, 1 + (i % 3)) select (i, f)];
        Assert.Equal((frames.Length, 29), (series.FrameCount, series.OtherFiles.Count));
        Parallel.For(0, 5 * frames.Length, n =>
        {
            (int file, int own) = frames[n * 7 % frames.Length];
            byte[] stored = PassThrough.Stored(series, n * 7 % frames.Length);
            Assert.Equal((1000 * file) + (100 * own) + 31, BitConverter.ToUInt16(stored, 2 * 16));
        });
        Assert.Empty(series.Unlike);
        Assert.Equal("30 of 30 files without a fault", Assert.Single(series.CheckHealth(CancellationToken.None)).Text);
        Assert.Throws<ArgumentOutOfRangeException>(() => series.Layout(frames.Length));
    }

    [Fact]
    public void Inspect_shows_a_folder_as_one_stack_and_names_what_is_unlike()
    {
        bench.Stack("night/f1.fits");
        bench.Stack("night/f2.fits");
        bench.Put("night/f11.fits", SmallFiles.Fits(9, 9, 1, CliBench.Sample));
        bench.Put("night/f3.fits", SmallFiles.Fits(64, 64, 3, CliBench.Sample)[..(2880 + 9000)]);

        ToolResult result = Tool.Stacks("inspect", bench.File("night"));
        Assert.Equal(65, result.ExitCode);
        Assert.Contains("night: fits, 10 frames", result.Output, StringComparison.Ordinal);
        Assert.Contains("files: 4, from f1.fits to f11.fits", result.Output, StringComparison.Ordinal);
        Assert.Contains("unlike the first: f3.fits (64 x 64 uint16); f11.fits (9 x 9 uint16)", result.Output, StringComparison.Ordinal);
        Assert.Contains("f3.fits: HDU 0 (primary): truncated", result.Output, StringComparison.Ordinal);
        Assert.Contains("3 of 4 files without a fault", result.Output, StringComparison.Ordinal);

        using JsonDocument told = JsonDocument.Parse(Tool.Stacks("inspect", bench.File("night/f?.fits"), "--json").Output);
        Assert.Equal(9, told.RootElement.GetProperty("stacks")[0].GetProperty("frames").GetInt32());
    }
}
