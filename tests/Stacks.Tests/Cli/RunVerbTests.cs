using System.Text.Json;
using Stacks.Tests.Catalogue;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Cli;

/// <summary>The verb <c>run</c> from the outside.</summary>
public sealed class RunVerbTests : IDisposable
{
    private const string Mirror = "title = \"Turn round\"\n[[step]]\nfilter = \"test-mirror\"\n[output]\nsamples = \"same\"\n";

    private readonly CliBench bench = new();

    public void Dispose() => bench.Dispose();

    [Fact]
    public void A_filter_from_a_plugin_folder_is_applied_to_whole_frames()
    {
        ToolResult result = bench.Run(bench.Recipe(Mirror), bench.Stack("a.fits"));

        Assert.Equal("", string.Join('\n', result.Error.Split('\n').Where(l => l.StartsWith("stacks:", StringComparison.Ordinal))));
        Assert.Equal(0, result.ExitCode);
        int[] expected = [.. from f in Enumerable.Range(0, CliBench.Frames)
                             from y in Enumerable.Range(0, CliBench.Height)
                             from x in Enumerable.Range(0, CliBench.Width)
                             select CliBench.Sample(CliBench.Width - 1 - x, y, f)];
        Assert.Equal(expected, SmallFiles.SamplesOf(Path.Combine(bench.Out, "a.fits"), expected.Length));
        Assert.Contains("4 frames of 8 x 6 uint16", result.Output, StringComparison.Ordinal);
        Assert.Contains("test-mirror wrote every pixel anew", result.Output, StringComparison.Ordinal);
        Assert.Contains("Keep the raw data", result.Output, StringComparison.Ordinal);
        Assert.Contains(Path.Combine(bench.Out, "a.fits.prov.json"), result.Output, StringComparison.Ordinal);
    }

    /// <summary>setrlimit(2): a write beyond RLIMIT_FSIZE raises SIGXFSZ, whose default ends the process, and fails by EFBIG otherwise.</summary>
    [NeedsFact("bash")]
    public void A_file_size_limit_is_an_error_with_its_name_and_exit_code()
    {
        string recipe = bench.Recipe(), stack = bench.Put("a.fits", SmallFiles.Fits(64, 64, 4, CliBench.Sample));
        ToolResult result = Tool.RunWith(
            new Dictionary<string, string> { ["DOTNET_EnableWriteXorExecute"] = "0" }, // its memory file would meet the limit too
            "bash", "-c", "ulimit -f 16; exec dotnet \"$@\"", "bash", Checkout.Host, "run", recipe, stack, "-o", bench.Out);

        Assert.Equal(74, result.ExitCode);
        Assert.Contains("EFBIG", result.Error, StringComparison.Ordinal);
        Assert.Empty(Directory.GetFiles(bench.Out));
    }

    /// <summary>astropy's own test file of a false checksum.</summary>
    [NeedsFact(Needs.RealDataNeed)]
    public void A_source_whose_checksum_does_not_agree_is_run_with_a_warning_that_stays_in_the_header()
    {
        ToolResult result = bench.Run(bench.Recipe(), RealData.File("bad", "checksum_false.fits"));

        Assert.Equal(0, result.ExitCode);
        Assert.Contains("DATASUM", result.Output, StringComparison.Ordinal);
        Assert.Contains("note: the source is damaged", File.ReadAllText(Path.Combine(bench.Out, "checksum_false.fits"), System.Text.Encoding.Latin1), StringComparison.Ordinal);
    }

    [Fact]
    public void A_second_run_finds_the_work_done_and_leaves_it()
    {
        string recipe = bench.Recipe(Mirror), stack = bench.Stack("a.fits");
        Assert.Equal(0, bench.Run(recipe, stack).ExitCode);
        DateTime made = File.GetLastWriteTimeUtc(Path.Combine(bench.Out, "a.fits"));

        ToolResult again = bench.Run(recipe, stack);
        Assert.Equal(0, again.ExitCode);
        Assert.Contains("is left as it is", again.Output, StringComparison.Ordinal);
        Assert.Equal(made, File.GetLastWriteTimeUtc(Path.Combine(bench.Out, "a.fits")));

        ToolResult other = bench.Run(bench.Recipe(Mirror + "mask = true\n"), stack);
        Assert.Equal(73, other.ExitCode);
    }

    [Fact]
    public void A_bad_file_among_many_does_not_stop_the_night()
    {
        string good = bench.Stack("a.fits"), late = bench.Stack("c.fits"), bad = bench.Put("b.fits", "text");

        ToolResult result = bench.Run(bench.Recipe(), good, bad, bench.File("none.fits"), late);

        Assert.Equal(65, result.ExitCode);
        Assert.True(File.Exists(Path.Combine(bench.Out, "a.fits")));
        Assert.True(File.Exists(Path.Combine(bench.Out, "c.fits")));
        Assert.False(File.Exists(Path.Combine(bench.Out, "b.fits")));
        Assert.Contains("4 stacks: 2 made, 0 done before, 2 failed", result.Output, StringComparison.Ordinal);
        Assert.Matches($"failed    {System.Text.RegularExpressions.Regex.Escape(bad)}: .* \\(exit code 65\\)", result.Output);
        Assert.Equal(2, result.Error.Split('\n').Count(l => l.StartsWith("stacks: ", StringComparison.Ordinal)));
    }

    [Fact]
    public void Json_is_one_document_and_nothing_else()
    {
        ToolResult result = bench.Run(bench.Recipe(Mirror), bench.Stack("a.fits"), bench.File("none.fits"), "--json");

        Assert.Equal(66, result.ExitCode);
        using JsonDocument document = JsonDocument.Parse(result.Output);
        JsonElement root = document.RootElement;
        Assert.Equal((66, 1, 0, 1), (root.GetProperty("exit_code").GetInt32(), root.GetProperty("made").GetInt32(),
            root.GetProperty("done_before").GetInt32(), root.GetProperty("failed").GetInt32()));
        JsonElement made = root.GetProperty("stacks")[0], failed = root.GetProperty("stacks")[1];
        Assert.Equal("made", made.GetProperty("outcome").GetString());
        Assert.Equal(CliBench.Frames, made.GetProperty("totals").GetProperty("frames").GetInt32());
        Assert.Equal(0, made.GetProperty("totals").GetProperty("replaced_bright").GetInt64());
        Assert.Matches("^[0-9a-f]{64}$", made.GetProperty("recipe_sha256").GetString()!);
        Assert.Equal("failed", failed.GetProperty("outcome").GetString());
        Assert.Equal(66, failed.GetProperty("exit_code").GetInt32());
        Assert.Contains("no such file", failed.GetProperty("error").GetString(), StringComparison.Ordinal);
    }

    [Fact]
    public void Json_tells_of_faults_before_the_night_too()
    {
        ToolResult result = bench.Run(bench.Recipe("titel = 1\n"), bench.Stack("a.fits"), "--json");

        using JsonDocument document = JsonDocument.Parse(result.Output);
        Assert.Equal(78, document.RootElement.GetProperty("exit_code").GetInt32());
        Assert.Contains("unknown key titel", document.RootElement.GetProperty("error").GetString(), StringComparison.Ordinal);
        Assert.StartsWith("stacks: ", result.Error, StringComparison.Ordinal);
    }

    [Fact]
    public void Dry_run_prints_the_plan_and_writes_nothing()
    {
        ToolResult result = bench.Run(bench.Recipe("[noise]\nfrom = \"values\"\ngain = 2\nread_noise = 4\npedestal = 100\n" + Mirror[Mirror.IndexOf('[', StringComparison.Ordinal)..]),
            bench.Stack("a.fits"), "--dry-run", "--workers", "3", "--memory", "1GiB");

        Assert.Equal((0, ""), (result.ExitCode, result.Error));
        Assert.False(Directory.Exists(bench.Out));
        foreach (string text in new[]
        {
            "a.fits -> " + Path.Combine(bench.Out, "a.fits"), "4 frames", "8 x 6 uint16 in ADU", "variance 0.5 ADU x (v - 100 ADU) + 4.08333 ADU^2", "step 1    test-mirror",
            "axis = x", "sees the whole frame", "uint16 read -> uint16 in step 1 -> uint16 written", "3 workers, 4 frames in flight", "of 1 GiB (--memory)", "sha256 ",
            "nothing was written",
        })
            Assert.Contains(text, result.Output, StringComparison.Ordinal);
    }

    [Fact]
    public void Dry_run_has_a_machine_form()
    {
        ToolResult result = bench.Run(bench.Recipe(Mirror), bench.Stack("a.fits"), "--dry-run", "--json");

        using JsonDocument document = JsonDocument.Parse(result.Output);
        JsonElement plan = document.RootElement.GetProperty("stacks")[0].GetProperty("plan");
        Assert.Equal(CliBench.Frames, plan.GetProperty("frames").GetInt32());
        Assert.Equal("test-mirror", plan.GetProperty("kinds")[0].GetProperty("steps")[0].GetProperty("filter").GetString());
        Assert.Equal(JsonValueKind.Null, plan.GetProperty("kinds")[0].GetProperty("steps")[0].GetProperty("reach").ValueKind);
        Assert.True(plan.GetProperty("memory_bytes").GetInt64() > 0);
    }

    [Fact]
    public void Plain_lines_tell_of_beginning_and_end_where_there_is_no_terminal()
    {
        string[] lines = bench.Run(bench.Recipe(), bench.Stack("a.fits")).Error.TrimEnd('\n').Split('\n');

        Assert.Equal("a.fits: 4 frames", lines[0]);
        Assert.Matches("^a\\.fits: done in 0:0[0-9], [0-9.E+]+ frames/s, [0-9.E+]+ MB/s$", lines[1]);
        Assert.Equal(2, lines.Length);
    }

    /// <summary>script (util-linux) gives the host a terminal.</summary>
    [NeedsFact("script")]
    public void On_a_terminal_a_live_line_tells_frames_rate_and_time_left()
    {
        string stack = bench.Put("a.fits", SmallFiles.Fits(200, 200, 6, (x, y, f) => 1000 + (((x * 31) + (y * 17) + f) % 50)));
        string recipe = bench.Recipe("[noise]\nfrom = \"frame\"\n[[step]]\nfilter = \"bilateral\"\nspatial_sigma = 2\n"); // long enough to be drawn
        string command = $"dotnet '{Checkout.Host}' run '{recipe}' '{stack}' '{bench.File("none.fits")}' -o '{bench.Out}'";

        ToolResult result = Tool.Run("script", "-qec", command, "/dev/null");

        Assert.Equal(66, result.ExitCode);
        Assert.Contains("[1/2] a.fits", result.Output, StringComparison.Ordinal);
        Assert.Contains("frames/s", result.Output, StringComparison.Ordinal);
        Assert.Contains("a.fits: done in 0:", result.Output, StringComparison.Ordinal);
        Assert.Contains("2 stacks: 1 made, 0 done before, 1 failed", result.Output, StringComparison.Ordinal);
    }

    [Fact]
    public void A_stopped_run_ends_with_75_and_leaves_no_result()
    {
        string stack = bench.Put("long.fits", SmallFiles.Fits(400, 400, 200, (x, y, f) => 1000 + (((x * 31) + (y * 17) + f) % 50)));
        string recipe = bench.Recipe("[noise]\nfrom = \"frame\"\n[[step]]\nfilter = \"bilateral\"\nspatial_sigma = 20\n");
        // The first line on stderr tells that the run has begun; it would take minutes.
        string script = $"""
            dotnet '{Checkout.Host}' run '{recipe}' '{stack}' -o '{bench.Out}' 2> '{bench.File("err")}' &
            pid=$!
            until [ -s '{bench.File("err")}' ]; do sleep 0.1; done
            kill -TERM $pid
            wait $pid
            """;

        ToolResult result = Tool.Run("bash", "-c", script);

        Assert.Equal(75, result.ExitCode);
        Assert.Contains("stopped on request", File.ReadAllText(bench.File("err")), StringComparison.Ordinal);
        Assert.False(File.Exists(Path.Combine(bench.Out, "long.fits")));
    }

    [Theory]
    [InlineData("--help", "run")]
    [InlineData("--help", "run", "run")]
    [InlineData("--help", "exit code", "inspect")]
    [InlineData("--help", "filters", "filters")]
    [InlineData("--version", "0.1.0")]
    public void Help_and_version(string option, string says, params string[] verb)
    {
        ToolResult result = Tool.Stacks([.. verb, option]);

        Assert.Equal((0, ""), (result.ExitCode, result.Error));
        Assert.Contains(says, result.Output, StringComparison.OrdinalIgnoreCase);
    }

    [Fact]
    public void Filters_lists_and_explains()
    {
        ToolResult list = Tool.Stacks("filters", "--plugins", PluginCatalogueTests.PluginFolder);
        Assert.Equal((0, ""), (list.ExitCode, list.Error));
        Assert.Contains("test-mirror", list.Output, StringComparison.Ordinal);
        Assert.Contains("formats: ", list.Output, StringComparison.Ordinal);

        ToolResult one = Tool.Stacks("filters", "test-mirror", "--plugins", PluginCatalogueTests.PluginFolder);
        foreach (string text in new[] { "least_width (px): Frames narrower than this are refused", "default   1", "allowed   1 to 100000", "raised    more frames are refused", "lowered   fewer", "smoothing", "textbook definition", "F(a v + b) = a F(v) + b" })
            Assert.Contains(text, one.Output, StringComparison.Ordinal);

        using JsonDocument document = JsonDocument.Parse(Tool.Stacks("filters", "test-mirror", "--json", "--plugins", PluginCatalogueTests.PluginFolder).Output);
        Assert.Equal("least_width", document.RootElement.GetProperty("parameters")[1].GetProperty("name").GetString());
        Assert.Equal("affine", document.RootElement.GetProperty("equivariance").GetString());
    }
}
