using System.Text;
using Stacks.Tests.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Cli;

/// <summary><c>run --salvage</c>: the whole frames of a truncated stack, and which are missing, on the terminal and in the result.</summary>
public sealed class SalvageTests : IDisposable
{
    private const int Block = 2880;
    private readonly CliBench bench = new();

    public void Dispose() => bench.Dispose();

    private static byte[] Cube => SmallFiles.Fits(64, 64, 4, CliBench.Sample);

    [Fact]
    public void Without_the_option_a_truncated_stack_is_refused_and_the_option_named()
    {
        string path = bench.Put("a.fits", Cube[..(Block + (2 * 64 * 64 * 2) + 100)]);

        bench.Refused(bench.Run(bench.Recipe(), path), 65, path, "frame 2", "truncated", "--salvage");
    }

    [Fact]
    public void Whole_frames_of_a_cube_are_processed_and_the_missing_ones_named()
    {
        string path = bench.Put("a.fits", Cube[..(Block + (2 * 64 * 64 * 2) + 100)]);

        ToolResult result = bench.Run(bench.Recipe(), path, "--salvage");

        Assert.Equal(0, result.ExitCode);
        Assert.Contains("a.fits: 2 frames", result.Output, StringComparison.Ordinal);
        Assert.Contains("salvaged: frames 2 to 3", result.Output, StringComparison.Ordinal);
        string made = Path.Combine(bench.Out, "a.fits");
        Assert.Equal([.. from f in Enumerable.Range(0, 2) from y in Enumerable.Range(0, 64) from x in Enumerable.Range(0, 64) select CliBench.Sample(x, y, f)], SmallFiles.SamplesOf(made, 2 * 64 * 64));
        Assert.Contains("salvaged: frames 2 to 3", File.ReadAllText(made, Encoding.Latin1), StringComparison.Ordinal);
        Assert.Contains("salvaged: frames 2 to 3", File.ReadAllText(made + ".prov.json"), StringComparison.Ordinal);
    }

    [Fact]
    public void Whole_pages_of_a_tiff_are_processed_and_the_rest_named()
    {
        TinyPage page = TinyFiles.Page(width: 40, height: 30);
        byte[] file = TinyTiff.Build(false, false, page, page, page);
        string path = bench.Put("a.tif", file[..^500]);

        bench.Refused(bench.Run(bench.Recipe(), path), 65, path, "page 2", "--salvage");
        ToolResult result = bench.Run(bench.Recipe(), path, "--salvage");

        Assert.Equal(0, result.ExitCode);
        Assert.Contains("a.tif: 2 frames", result.Output, StringComparison.Ordinal);
        Assert.Contains("salvaged: page 2", result.Output, StringComparison.Ordinal);
        Assert.Contains("salvaged: page 2", File.ReadAllText(Path.Combine(bench.Out, "a.tif.prov.json")), StringComparison.Ordinal);
        Assert.Contains("salvaged: page 2", File.ReadAllText(Path.Combine(bench.Out, "a.tif")), StringComparison.Ordinal);
    }

    [Fact]
    public void A_stack_without_a_whole_frame_is_refused_with_the_option_too()
    {
        string path = bench.Put("a.fits", Cube[..(Block + 100)]);

        bench.Refused(bench.Run(bench.Recipe(), path, "--salvage"), 65, path, "before the end of its first frame");
    }
}
