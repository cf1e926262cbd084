using System.Globalization;
using System.Text;
using System.Text.Json;
using System.Xml.Linq;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>
/// The README shows what the program does, not what it once did: each <see cref="ReadmeBlock"/> equals what is made here
/// from real runs.
/// </summary>
[Collection(SampleRuns.Name)]
public sealed class ReadmeTests(NightFieldRun field, SmoothNightFieldRun smooth, WanderingCellsRun cells, FourChipsRun chips)
{
    [Fact]
    public void TheOutputShownIsReal() => ReadmeBlock.AssertIs("output", $"```\n{field.Printed.TrimEnd()}\n```");

    [Fact]
    public void TheFiltersAreThoseInstalled()
    {
        ToolResult result = Tool.Stacks("filters", "--json");
        using JsonDocument told = JsonDocument.Parse(result.Output);
        StringBuilder table = new("| filter | kind | noise model | what it does | parameters (default) |\n|---|---|---|---|---|");
        foreach (JsonElement filter in told.RootElement.GetProperty("filters").EnumerateArray())
        {
            IEnumerable<string> parameters = filter.GetProperty("parameters").EnumerateArray().Select(p =>
                $"`{p.GetProperty("name")}` ({(p.GetProperty("default") is { ValueKind: not JsonValueKind.Null } value ? value : "must be stated")})");
            table.Append(CultureInfo.InvariantCulture,
                $"\n| `{filter.GetProperty("id")}` | {filter.GetProperty("kind")} | {(filter.GetProperty("needs_noise").GetBoolean() ? "needed" : "-")} | {Cell(filter.GetProperty("summary"))} | {string.Join(", ", parameters)} |");
        }

        ReadmeBlock.AssertIs("filters", table.ToString());
    }

    [Fact]
    public void TheRemovalFiguresAreMeasured()
    {
        StringBuilder table = new("| planted pixels above 10 local sigma | night field | cells | chips |\n|---|---|---|---|");
        foreach ((string label, string kind) in new[]
        {
            ("isolated hits", "isolated"), ("8-connected tracks", "track"), ("tracks with charge by path length", "path-track"),
            ("2 x 2 blocks", "block"), ("hot pixels", "hot"),
        })
            Row(label, p => p.Kind == kind && !p.OnSource && p.IsAboveTenSigma);
        Row("on source light, higher than the source's peak", p => p.OnSource && p.Height > p.SourcePeak && p.IsAboveTenSigma);
        Row("on source light, above it but lower than the peak", p => p.OnSource && p.Height > p.SourceLight && p.Height <= p.SourcePeak && p.IsAboveTenSigma);
        table.Append(CultureInfo.InvariantCulture, $"\n| clean pixels replaced | {Clean(field)} | {Clean(cells)} | {Clean(chips)} |");
        ReadmeBlock.AssertIs("removal", table.ToString());

        void Row(string label, Func<PlantedPixel, bool> which) =>
            table.Append(CultureInfo.InvariantCulture, $"\n| {label} | {Share(field, which)} | {Share(cells, which)} | {Share(chips, which)} |");
    }

    [Fact]
    public void TheSmoothingFiguresAreMeasured()
    {
        Smoothing smoothing = new(field, smooth);
        double least = Enumerable.Range(0, field.Before.Count).Min(frame => smoothing.NoiseRatio(frame).Ratio);
        StringBuilder table = new("| signal to noise in 5 px | stars | mean change, aperture of 5 px | of 2.5 px | beyond 1 sigma, 5 px |\n|---|---|---|---|---|");
        foreach ((double from, double to) in Smoothing.Classes)
        {
            List<double> wide = smoothing.Changes((from, to)), narrow = smoothing.Changes((from, to), 2.5);
            table.Append(CultureInfo.InvariantCulture,
                $"\n| {from} to {to} | {wide.Count} | {wide.Average():F2} sigma | {narrow.Average():F2} sigma | {100.0 * wide.Count(c => Math.Abs(c) > 1) / wide.Count:F1} % |");
        }

        table.Append(CultureInfo.InvariantCulture, $"\n\nNoise in empty patches is at least {Math.Floor(10 * least) / 10:F1} times lower in every frame.");
        ReadmeBlock.AssertIs("smoothing", table.ToString());
    }

    [Fact]
    public void TheCardsThatMayDifferAreTheDeclaredOnes()
    {
        StringBuilder table = new("| cards | in headers | what becomes of them |\n|---|---|---|");
        foreach (CardChange change in CardChanges.Declared)
            table.Append(CultureInfo.InvariantCulture, $"\n| {string.Join(", ", change.Keywords.Select(k => k.Length == 0 ? "blank cards" : k))} | {change.When} | {change.What} |");
        ReadmeBlock.AssertIs("cards", table.ToString());
    }

    [Fact]
    public void EveryPackageHasItsReason()
    {
        string[] projects = Directory.GetFiles(Checkout.Root, "*.csproj", SearchOption.AllDirectories);
        string[] packages = [.. projects.SelectMany(p => XDocument.Load(p).Descendants("PackageReference")).Select(r => r.Attribute("Include")!.Value).Distinct()];
        Assert.NotEmpty(packages);
        string[] rows = [.. File.ReadAllLines(Path.Combine(Checkout.Root, "README.md")).Where(line => line.StartsWith("| ", StringComparison.Ordinal)).Select(line => line.Split('|')[1])];
        Assert.All(packages, package => Assert.Contains(rows, row => row.Split(',').Any(name => name.Trim() == package)));
    }

    private static string Share(SampleRun run, Func<PlantedPixel, bool> which)
    {
        if (!run.Planted.Any(which))
            return "-";
        (double rate, int count) = run.Rate(which);
        return string.Create(CultureInfo.InvariantCulture, $"{100 * rate:F1} % of {count}");
    }

    private static string Clean(SampleRun run)
    {
        (List<(int, int, int)> replaced, long clean) = run.CleanPixels();
        return string.Create(CultureInfo.InvariantCulture, $"{replaced.Count} of {clean}");
    }

    private static string Cell(JsonElement text) => text.GetString()!.Replace("|", "\\|", StringComparison.Ordinal).Replace("_", "\\_", StringComparison.Ordinal);
}
