using System.Text.Json;
using Stacks.Pipeline;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Cli;

/// <summary>The verb <c>inspect</c> from the outside.</summary>
public sealed class InspectVerbTests : IDisposable
{
    private readonly CliBench bench = new();

    public void Dispose() => bench.Dispose();

    [Fact]
    public void A_whole_stack()
    {
        ToolResult result = Tool.Stacks("inspect", bench.Stack("a.fits"));

        Assert.Equal((0, ""), (result.ExitCode, result.Error));
        Assert.Contains("a.fits: fits, 4 frames", result.Output, StringComparison.Ordinal);
        Assert.Contains("4 of 8 x 6 uint16 in ADU", result.Output, StringComparison.Ordinal);
    }

    [Fact]
    public void Figures_are_those_of_the_samples()
    {
        // Frame 1 holds two saturated samples; minima and maxima are the corners, and the median is the mean of the two middle ones.
        string stack = bench.Put("a.fits", SmallFiles.Fits(4, 2, 2, (x, y, f) => (f, y, x) is (1, 1, > 1) ? 65535 : (100 * f) + (4 * y) + x));

        ToolResult result = Tool.Stacks("inspect", stack, "--json");

        Assert.Equal(0, result.ExitCode);
        using JsonDocument document = JsonDocument.Parse(result.Output);
        JsonElement figures = document.RootElement.GetProperty("stacks")[0].GetProperty("figures");
        Assert.Equal([0.0, 3.5, 7.0, 0.0, 0.0], Row(figures[0]));
        Assert.Equal([100.0, 103.5, 65535.0, 0.0, 2.0], Row(figures[1]));
    }

    [Fact]
    public void A_truncated_stack_is_shown_as_far_as_it_goes_and_called_damaged()
    {
        byte[] whole = SmallFiles.Fits(40, 40, 4, CliBench.Sample);
        string stack = bench.Put("a.fits", whole[..(2880 + (40 * 40 * 2 * 2) + 100)]);

        ToolResult result = Tool.Stacks("inspect", stack);

        Assert.Equal(65, result.ExitCode);
        Assert.Contains("DAMAGED", result.Output, StringComparison.Ordinal);
        Assert.Contains("2 frames", result.Output, StringComparison.Ordinal);
    }

    [Fact]
    public void The_others_are_shown_when_one_cannot_be_read()
    {
        ToolResult result = Tool.Stacks("inspect", bench.Put("b.fits", "text"), bench.Stack("a.fits"), bench.File("none.fits"));

        Assert.Equal(65, result.ExitCode);
        Assert.Contains("a.fits: fits, 4 frames", result.Output, StringComparison.Ordinal);
        Assert.Equal(2, result.Error.TrimEnd('\n').Split('\n').Length);
    }

    [Theory]
    [InlineData(0, new int[0])]
    [InlineData(3, new[] { 0, 1, 2 })]
    [InlineData(16, new[] { 0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15 })]
    [InlineData(17, new[] { 0, 1, 2, 3, 4, 5, 6, 7, 9, 10, 11, 12, 13, 14, 15, 16 })]
    [InlineData(1501, new[] { 0, 100, 200, 300, 400, 500, 600, 700, 800, 900, 1000, 1100, 1200, 1300, 1400, 1500 })]
    public void Frames_looked_at(int count, int[] expected) => Assert.Equal(expected, StackInspector.EvenlySpaced(count));

    private static double[] Row(JsonElement figures) =>
        [.. new[] { "minimum", "median", "maximum", "missing", "saturated" }.Select(k => figures.GetProperty(k).GetDouble())];
}
