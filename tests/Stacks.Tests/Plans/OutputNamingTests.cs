using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Plans;

/// <summary>One output for every input, none over an input, none over another.</summary>
public sealed class OutputNamingTests : IDisposable
{
    private readonly PlanBench bench = new();

    public void Dispose() => bench.Dispose();

    [Theory]
    [InlineData("a.sky", "", "a.sky")]
    [InlineData("a.SK", "", "a.SK")]
    [InlineData("a.b.sky", "", "a.b.sky")]
    [InlineData("a.sky.gz", "", "a.sky")]
    [InlineData("a.sky.fz", "", "a.sky")]
    [InlineData("a.fz", "", "a.sky")]
    [InlineData("a.dat", "", "a.dat.sky")]
    [InlineData("night.2024", "", "night.2024.sky")]
    [InlineData("a.sky.fz", "compression = \"lossless\"", "a.sky.fz")]
    [InlineData("a.sky.gz", "compression = \"lossless\"", "a.sky")]
    [InlineData("a.sky", "compression = \"lossless\"", "a.sky")]
    [InlineData("a.sky", "format = \"cell\"", "a.cell")]
    [InlineData("a.sky.gz", "format = \"cell\"", "a.cell")]
    [InlineData("a.sk", "format = \"cell\"", "a.cell")]
    [InlineData("a.sky", "format = \"same\"", "a.sky")]
    public void Name_in_a_folder(string input, string output, string expected)
    {
        NamedOutput item = Assert.Single(bench.Name("[output]\n" + output, bench.Out, bench.Put(input, "sky")));

        Assert.Null(item.Fault);
        Assert.Equal(Path.Combine(bench.Out, expected), item.Output);
        Assert.False(Directory.Exists(bench.Out));
    }

    [Fact]
    public void One_input_may_name_its_output()
    {
        string input = bench.Put("a.sky", "sky");

        Assert.Equal(bench.File("b.sk"), bench.Name("", bench.File("b.sk"), input)[0].Output);
        Assert.Equal(bench.File("b.cell"), bench.Name("[output]\nformat = \"cell\"", bench.File("b.cell"), input)[0].Output);
        Assert.Equal("cell", bench.Name("", bench.File("b.cell"), input)[0].OutputFormat!.Format.Id);
        Assert.Equal("sky", bench.Name("", bench.File("b.sky"), input)[0].OutputFormat!.Format.Id);
        Assert.Equal(Path.Combine(bench.File("b"), "a.sky"), bench.Name("", bench.File("b"), input)[0].Output);
        Assert.Equal(Path.Combine(bench.File("b.sky/"), "a.sky"), bench.Name("", bench.File("b.sky/"), input)[0].Output);
    }

    [Fact]
    public void A_folder_with_a_formats_ending_is_a_folder_when_it_is_there()
    {
        Directory.CreateDirectory(bench.File("b.sky"));
        Assert.Equal(Path.Combine(bench.File("b.sky"), "a.sky"), bench.Name("", bench.File("b.sky"), bench.Put("a.sky", "sky"))[0].Output);
    }

    [Fact]
    public void A_file_name_for_two_inputs_or_of_another_format_is_a_usage_error()
    {
        string a = bench.Put("a.sky", "sky"), b = bench.Put("b.sky", "sky");

        Assert.Contains("names one file for 2 inputs", Assert.Throws<UsageException>(() => bench.Name("", bench.File("c.sky"), a, b)).Message, StringComparison.Ordinal);
        Assert.Contains("end the name with .sky", Assert.Throws<UsageException>(() => bench.Name("[output]\nformat = \"sky\"", bench.File("c.cell"), a)).Message, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("x/a.sky", "y/a.sky", "")]
    [InlineData("x/a.sky", "x/a.sky.gz", "")]
    [InlineData("x/a.sky", "y/a.sk", "format = \"cell\"")]
    public void Two_inputs_of_one_name_are_refused(string first, string second, string output)
    {
        string a = bench.Put(first, "sky"), b = bench.Put(second, "sky");

        OutputException fault = Assert.Throws<OutputException>(() => bench.Name("[output]\n" + output, bench.Out, a, b));

        Assert.Equal(73, fault.ExitCode);
        Assert.Contains(a, fault.Message, StringComparison.Ordinal);
        Assert.Contains(b, fault.Message, StringComparison.Ordinal);
        Assert.False(Directory.Exists(bench.Out));
    }

    [Fact]
    public void An_output_over_an_input_is_refused()
    {
        string a = bench.Put("x/a.sky", "sky"), b = bench.Put("y/b.sky", "sky");

        Assert.Contains("would overwrite the input", Assert.Throws<OutputException>(() => bench.Name("", bench.File("x"), a)).Message, StringComparison.Ordinal);
        Assert.Throws<OutputException>(() => bench.Name("", bench.File("x/../x/a.sky"), a));
        // Not its own input, but another one of the night.
        string c = bench.Put("y/a.sky", "sky");
        Assert.Throws<OutputException>(() => bench.Name("", bench.File("y"), a, b, c));
        Assert.Throws<OutputException>(() => bench.Name("", bench.File("y"), a, c));
    }

    [Fact]
    public void An_output_over_an_input_through_links_is_refused()
    {
        string a = bench.Put("x/a.sky", "sky");
        Directory.CreateSymbolicLink(bench.File("link"), bench.File("x"));
        Directory.CreateSymbolicLink(bench.File("link2"), "link");
        File.CreateSymbolicLink(bench.File("same.sky"), a);
        Directory.CreateDirectory(bench.File("z"));
        File.CreateSymbolicLink(bench.File("z/a.sky"), "../x/a.sky");

        Assert.Throws<OutputException>(() => bench.Name("", bench.File("link"), a));
        Assert.Throws<OutputException>(() => bench.Name("", bench.File("link2"), a));
        Assert.Throws<OutputException>(() => bench.Name("", bench.File("x/a.sky"), bench.File("same.sky")));
        Assert.Throws<OutputException>(() => bench.Name("", bench.File("z"), a));
        Assert.Throws<OutputException>(() => bench.Name("", bench.Out, a, a));
    }

    [Fact]
    public void Links_in_a_circle_end()
    {
        File.CreateSymbolicLink(bench.File("p"), bench.File("q"));
        File.CreateSymbolicLink(bench.File("q"), bench.File("p"));

        Assert.StartsWith(Path.GetTempPath(), RealPath.Of(bench.File("p/a.sky")), StringComparison.Ordinal);
    }

    [Fact]
    public void Faulty_inputs_keep_their_place()
    {
        string good = bench.Put("a.sky", "sky"), text = bench.Put("b.sky", "some text"), empty = bench.Put("c.sky", ""), odd = bench.Put("d.txt", "text");

        IReadOnlyList<NamedOutput> items = bench.Name("", bench.Out, text, good, bench.File("none.sky"), empty, odd, Path.GetDirectoryName(good)!);

        Assert.Equal(6, items.Count);
        Assert.Null(items[1].Fault);
        Assert.Contains("its name promises SKY but its content is something else; known formats are sky, cell", items[0].Fault!.Message, StringComparison.Ordinal);
        Assert.Equal(65, items[0].Fault!.ExitCode);
        Assert.Equal(66, items[2].Fault!.ExitCode);
        Assert.Contains("is empty", items[3].Fault!.Message, StringComparison.Ordinal);
        Assert.Contains("of no known format", items[4].Fault!.Message, StringComparison.Ordinal);
        Assert.Contains("is a folder", items[5].Fault!.Message, StringComparison.Ordinal);
    }

    [Fact]
    public void An_unknown_output_format_is_named_with_its_place()
    {
        RecipeException fault = Assert.Throws<RecipeException>(() => bench.Name("[output]\nformat = \"skye\"", bench.Out, bench.Put("a.sky", "sky")));

        Assert.EndsWith("r.toml:2:1: unknown output format skye; did you mean sky? known are same, sky, cell", fault.Message, StringComparison.Ordinal);
    }
}
