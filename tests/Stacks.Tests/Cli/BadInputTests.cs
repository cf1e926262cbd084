using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Cli;

/// <summary>Everything a user can get wrong ends in one line and an exit code, with nothing under the final name.</summary>
public sealed class BadInputTests : IDisposable
{
    private readonly CliBench bench = new();

    public void Dispose() => bench.Dispose();

    [Fact]
    public void Unknown_recipe_key() => bench.Refused(
        bench.Run(bench.Recipe("[output]\nsmaples = \"same\"\n"), bench.Stack("a.fits")), 78, "r.toml:2:1: ", "unknown key smaples", "did you mean samples?");

    [Fact]
    public void Value_out_of_range() => bench.Refused(
        bench.Run(bench.Recipe("[[step]]\nfilter = \"test-mirror\"\nleast_width = 0\n"), bench.Stack("a.fits")), 78,
        "r.toml:3:1: ", "least_width", "0 is not allowed", "give 1 to 100000 (px)");

    [Fact]
    public void Value_that_does_not_fit_the_stack() => bench.Refused(
        bench.Run(bench.Recipe("[[step]]\nfilter = \"test-mirror\"\nleast_width = 9\n"), bench.Stack("a.fits")), 78,
        "r.toml:3:1: ", "only 8 px wide", "lower it");

    [Fact]
    public void Unknown_filter() => bench.Refused(
        bench.Run(bench.Recipe("[[step]]\nfilter = \"test-miror\"\n"), bench.Stack("a.fits")), 78, "r.toml:2:1: ", "unknown filter test-miror", "did you mean test-mirror?");

    [Fact]
    public void Recipe_that_is_no_toml() => bench.Refused(
        bench.Run(bench.Recipe("[output\n"), bench.Stack("a.fits")), 78, "r.toml:1:", "not valid TOML");

    [Fact]
    public void Missing_stack() => bench.Refused(bench.Run(bench.Recipe(), bench.File("none.fits")), 66, "none.fits: no such file");

    [Fact]
    public void Missing_recipe() => bench.Refused(bench.Run(bench.File("none.toml"), bench.Stack("a.fits")), 66, "none.toml: no such recipe");

    [Fact]
    public void Text_file_named_fits() => bench.Refused(
        bench.Run(bench.Recipe(), bench.Put("a.fits", "Observing log of a cloudy night.\n")), 65, "a.fits: ", "content is something else", "known formats are ");

    [Fact]
    public void Empty_file() => bench.Refused(bench.Run(bench.Recipe(), bench.Put("a.fits", "")), 65, "a.fits: is empty");

    [Theory]
    [InlineData(2880 + 100)]
    [InlineData(2880)]
    [InlineData(2000)]
    public void Truncated_cube(int length)
    {
        byte[] whole = SmallFiles.Fits(CliBench.Width, CliBench.Height, CliBench.Frames, CliBench.Sample);
        bench.Refused(bench.Run(bench.Recipe(), bench.Put("a.fits", whole[..length])), 65, "a.fits");
    }

    [Fact]
    public void Fits_of_999_axes() => bench.Refused(bench.Run(bench.Recipe(), bench.Put("a.fits", SmallFiles.FitsOf999Axes())), 65, "a.fits", "NAXIS");

    [Fact]
    public void Tiff_of_12_bits() => bench.Refused(bench.Run(bench.Recipe(), bench.Put("a.tif", SmallFiles.Tiff(12))), 65, "a.tif", "12");

    /// <summary>The same file with 16 bits is good: it is the 12 that is refused.</summary>
    [Fact]
    public void Tiff_of_16_bits_is_read() => Assert.Equal(0, bench.Run(bench.Recipe(), bench.Put("a.tif", SmallFiles.Tiff(16))).ExitCode);

    [Fact]
    public void Two_inputs_of_one_name() => bench.Refused(
        bench.Run(bench.Recipe(), bench.Stack("x/a.fits"), bench.Stack("y/a.fits")), 73, "out/a.fits: ", "x/a.fits", "y/a.fits");

    [Fact]
    public void Output_over_an_input()
    {
        string input = bench.Stack("a.fits");
        byte[] before = File.ReadAllBytes(input);

        bench.Refused(Tool.Stacks("run", bench.Recipe(), input, "-o", bench.Folder, "--overwrite"), 73, "would overwrite the input");
        Assert.Equal(before, File.ReadAllBytes(input));
    }

    [Fact]
    public void Output_that_was_made_otherwise()
    {
        string foreign = bench.Put("out/a.fits", "something of value");

        ToolResult refused = bench.Run(bench.Recipe(), bench.Stack("a.fits"));
        Assert.Equal(73, refused.ExitCode);
        Assert.Contains("out/a.fits: ", refused.Error, StringComparison.Ordinal);
        Assert.Contains("--overwrite", refused.Error, StringComparison.Ordinal);
        Assert.Equal("something of value", File.ReadAllText(foreign));

        Assert.Equal(0, bench.Run(bench.Recipe(), bench.File("a.fits"), "--overwrite").ExitCode);
        Assert.StartsWith("SIMPLE", File.ReadAllText(foreign), StringComparison.Ordinal);
    }

    [Fact]
    public void Output_folder_that_cannot_be_made()
    {
        string blocker = bench.Put("blocker", "a file");

        bench.Refused(Tool.Stacks("run", bench.Recipe(), bench.Stack("a.fits"), "-o", Path.Combine(blocker, "out")), 73, "cannot be created");
    }

    [Theory]
    [InlineData("see stacks --help")]
    [InlineData("there is no verb clean; known are run, inspect, filters; see stacks --help", "clean")]
    [InlineData("did you mean inspect?", "inspct", "a.fits")]
    [InlineData("see stacks run --help", "run", "r.toml", "a.fits")]
    [InlineData("see stacks run --help", "run", "r.toml", "-o", "out")]
    [InlineData("see stacks run --help", "run", "r.toml", "a.fits", "-o", "out", "--wrokers", "2")]
    [InlineData("Unknown option --jsn", "filters", "--jsn")]
    [InlineData("see stacks run --help", "run", "r.toml", "a.fits", "-o", "out", "--workers", "two")]
    [InlineData("give 1 to 4096", "run", "r.toml", "a.fits", "-o", "out", "--workers", "0")]
    [InlineData("such as 4GiB", "run", "r.toml", "a.fits", "-o", "out", "--memory", "much")]
    [InlineData("such as 4GiB", "run", "r.toml", "a.fits", "-o", "out", "--memory", "0GiB")]
    [InlineData("no such folder", "run", "r.toml", "a.fits", "-o", "out", "--plugins", "/nowhere/at/all")]
    [InlineData("no such filter is installed", "filters", "none")]
    [InlineData("see stacks inspect --help", "inspect")]
    public void Wrong_command_line(string says, params string[] arguments) => bench.Refused(Tool.Stacks(arguments), 64, says);

    [Fact]
    public void Memory_that_holds_no_frame() => bench.Refused(
        bench.Run(bench.Recipe(), bench.Stack("a.fits"), "--memory", "1MiB"), 64, "--memory: 1MiB do not hold one frame in flight", "or more");

    [Fact]
    public void Plugin_that_cannot_be_loaded()
    {
        string file = bench.Put("mine/Odd/Odd.dll", "no assembly");

        bench.Refused(Tool.Stacks("filters", "--plugins", bench.File("mine")), 70, file, "cannot be loaded");
    }

    [Fact]
    public void Verbose_adds_the_stack_trace()
    {
        ToolResult result = bench.Run(bench.Recipe(), bench.File("none.fits"), "--verbose");

        Assert.Equal(66, result.ExitCode);
        Assert.StartsWith("stacks: ", result.Error, StringComparison.Ordinal);
        Assert.Contains("   at Stacks.", result.Error, StringComparison.Ordinal);
    }

    [NeedsTheory(Needs.RealDataNeed)]
    [InlineData("bad")]
    public void Broken_and_hostile_files_of_the_real_data_give_a_typed_error_or_a_result(string name)
    {
        foreach (string file in Directory.GetFiles(RealData.File(name)).Where(f => Path.GetExtension(f) is ".fits" or ".fit" or ".tif" or ".tiff"))
        {
            ToolResult result = Tool.Stacks("run", bench.Recipe(), file, "-o", bench.Out);
            Assert.True(result.ExitCode is 0 or 65, $"{file}: exit code {result.ExitCode}: {result.Error}");
            Assert.DoesNotContain("internal error", result.Error, StringComparison.Ordinal);
            Assert.DoesNotContain("   at ", result.Error, StringComparison.Ordinal);
            Assert.DoesNotContain(".partial", string.Concat(Directory.Exists(bench.Out) ? Directory.GetFiles(bench.Out) : []), StringComparison.Ordinal);
        }
    }
}
