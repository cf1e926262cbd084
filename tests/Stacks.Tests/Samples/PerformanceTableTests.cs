using System.Text;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>The README's speeds are those of the committed result files, each with what it was measured on.</summary>
public sealed class PerformanceTableTests
{
    private static readonly string[] Known = ["date", "machine", "runtime", "references"];

    [Fact]
    public void TheSpeedsAreThoseOfTheResultFiles()
    {
        StringBuilder block = new();
        foreach (string path in ResultFiles())
        {
            (Dictionary<string, string> header, string[][] rows) = Read(path);
            block.Append(block.Length > 0 ? "\n\n" : "").Append($"Measured on {header["date"]}: {header["machine"]}; {header["runtime"]}. References: {header["references"]}.\n");
            block.Append("\n| compared | ours | reference | ratio | goal | |\n|---|---|---|---|---|---|");
            foreach (string[] row in rows)
                block.Append($"\n| {string.Join(" | ", row)} |");
        }

        ReadmeBlock.AssertIs("performance", block.ToString());
    }

    [Fact]
    public void EveryResultFileSaysWhatItWasMeasuredOn()
    {
        Assert.NotEmpty(ResultFiles());
        Assert.All(ResultFiles(), path =>
        {
            (Dictionary<string, string> header, string[][] rows) = Read(path);
            Assert.Equal(Known, header.Keys);
            Assert.Matches("^[0-9]{4}-[0-9]{2}-[0-9]{2}$", header["date"]);
            Assert.NotEmpty(rows);
            Assert.All(rows, row => Assert.True(row is [_, _, _, _, _, "met" or "below" or "shown"], string.Join('\t', row)));
        });
    }

    private static string[] ResultFiles() =>
        [.. Directory.GetFiles(Path.Combine(Checkout.Root, "tests", "Stacks.Benchmarks", "results"), "*.tsv").Order(StringComparer.Ordinal)];

    /// <summary>Lines <c># NAME: TEXT</c>, then a line of column names, then rows.</summary>
    private static (Dictionary<string, string> Header, string[][] Rows) Read(string path)
    {
        string[] lines = File.ReadAllLines(path);
        return (
            lines.TakeWhile(line => line.StartsWith("# ", StringComparison.Ordinal)).Select(line => line[2..].Split(": ", 2)).ToDictionary(parts => parts[0], parts => parts[1]),
            [.. lines.SkipWhile(line => line.StartsWith("# ", StringComparison.Ordinal)).Skip(1).Select(line => line.Split('\t'))]);
    }
}
