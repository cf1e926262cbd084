using System.Globalization;
using Stacks.TestSupport;

namespace Stacks.Tests.Samples;

/// <summary>A truth table of sample-stacks: rows of numbers by column name.</summary>
internal static class Truth
{
    public static string Path(string name) => System.IO.Path.Combine(Checkout.Root, "sample-stacks", name);

    public static List<Dictionary<string, string>> Table(string name)
    {
        string[] lines = File.ReadAllLines(Path(name));
        string[] columns = lines[0].Split('\t');
        return [.. lines.Skip(1).Select(line => columns.Zip(line.Split('\t')).ToDictionary(c => c.First, c => c.Second))];
    }

    public static double Number(this Dictionary<string, string> row, string column) => double.Parse(row[column], CultureInfo.InvariantCulture);

    public static int Integer(this Dictionary<string, string> row, string column) => int.Parse(row[column], CultureInfo.InvariantCulture);

    public static List<PlantedPixel> Impulses(string name) =>
        [.. Table(name).Select(row => new PlantedPixel(
            row.Integer("frame"), row["kind"], row.Integer("x_px"), row.Integer("y_px"), row.Number("height_adu"), row.Number("source_light_adu"),
            row.Number("source_peak_adu"), row["on_source"] == "1", row.Number("local_sigma_adu")))];
}

/// <summary>A pixel of a planted impulse, as its table's row has it.</summary>
internal sealed record PlantedPixel(
    int Frame, string Kind, int X, int Y, double Height, double SourceLight, double SourcePeak, bool OnSource, double LocalSigma)
{
    /// <summary>The population that the truth figures are stated for.</summary>
    public bool IsAboveTenSigma => Height > 10 * LocalSigma;
}

/// <summary>A point source where it stands in one frame. Flux in electrons.</summary>
internal sealed record PlantedSource(int Frame, double Flux, double X, double Y)
{
    /// <summary>Column of the pixel that its centre falls on.</summary>
    public int Column => (int)Math.Round(X);

    /// <summary>Row of the pixel that its centre falls on.</summary>
    public int Row => (int)Math.Round(Y);
}
