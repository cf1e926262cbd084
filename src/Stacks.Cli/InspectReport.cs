using System.Globalization;
using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>What <c>inspect</c> prints.</summary>
internal static class InspectReport
{
    /// <summary>For people.</summary>
    public static void WriteText(StackInspection found)
    {
        Console.WriteLine($"{found.Path}: {found.Format}, {Describe.Frames(found.FrameCount)}, {ByteSize.Show(found.FileBytes)}");
        foreach ((FrameLayout layout, int count) in found.Layouts)
            Line("frames", $"{count} of {Describe.Layout(layout)}");
        foreach (HeaderFact fact in found.Facts)
            Line("header", $"{fact.Label}: {fact.Value}");
        if (found.Noise is { } noise)
            Line("noise", NoiseText(noise));
        WriteParts(found.Parts);
        WriteFigures(found);
        foreach (HealthFinding finding in found.Health)
            Line(finding.IsProblem ? "DAMAGED" : "health", finding.Text);
        if (found.Health.Count == 0)
            Line("health", "no fault found; the file has no checksums to compare");
    }

    /// <summary>For machines.</summary>
    public static object Facts(StackInspection found) => new
    {
        found.Path,
        found.Format,
        found.FileBytes,
        Frames = found.FrameCount,
        Layouts = found.Layouts.Select(l => new { Frames = l.Count, Layout = Describe.LayoutFacts(l.Layout) }),
        Header = found.Facts.Select(f => new { f.Label, f.Value }),
        Noise = found.Noise,
        Parts = found.Parts,
        FramesDecoded = found.Figures.Count,
        Figures = found.Figures.Select(f => new
        {
            f.Frame,
            Channel = f.Layout.ChannelName ?? f.Layout.Channel?.ToString(CultureInfo.InvariantCulture),
            f.Layout.Z,
            f.Layout.Time,
            f.Layout.Extension,
            f.Minimum,
            f.Median,
            f.Maximum,
            f.Noise,
            f.Missing,
            f.Saturated,
        }),
        Health = found.Health.Select(h => new { Problem = h.IsProblem, h.Text }),
        Damaged = found.IsBroken,
    };

    private static void WriteParts(IReadOnlyList<StackPart> parts)
    {
        if (parts.Count == 0)
            return;
        Console.WriteLine();
        TextTable table = new("part", "shape", "role", "in a run");
        foreach (StackPart part in parts)
            table.Add(part.Name, part.Shape, part.Role, part.Fate);
        table.Write(Console.Out, "  ");
    }

    private static void WriteFigures(StackInspection found)
    {
        if (found.Figures.Count == 0)
            return;
        Console.WriteLine();
        if (found.Figures.Count < found.FrameCount)
            Console.WriteLine($"  values of {found.Figures.Count} frames at even distances of {found.FrameCount}:");
        TextTable table = new("frame", "place", "minimum", "median", "maximum", "noise sigma", "missing", "saturated");
        foreach (FrameFigures f in found.Figures)
        {
            table.Add(f.Frame.ToString(CultureInfo.InvariantCulture), Place(f.Layout), Describe.Number(f.Minimum), Describe.Number(f.Median), Describe.Number(f.Maximum),
                Describe.Number(f.Noise), f.Missing.ToString(CultureInfo.InvariantCulture), f.Saturated.ToString(CultureInfo.InvariantCulture));
        }

        table.Write(Console.Out, "  ");
        Console.WriteLine();
    }

    private static string NoiseText(HeaderNoise noise)
    {
        if (noise.Gain is null && noise.ReadNoise is null && noise.Pedestal is null)
            return noise.Origin.Length > 0 ? noise.Origin : "the headers say nothing of gain, read noise or pedestal";
        string text = $"gain {Known(noise.Gain, "e-/ADU")}, read noise {Known(noise.ReadNoise, "e-")}, pedestal {Known(noise.Pedestal, "ADU")} ({noise.Origin})";
        return noise.Doubt is null ? text : $"{text}; {noise.Doubt}";
    }

    private static string Known(double? number, string unit) => number is { } n ? $"{Describe.Number(n)} {unit}" : "unknown";

    private static string Place(FrameLayout layout)
    {
        List<string> parts = [];
        if (layout.ChannelName is not null || layout.Channel is not null)
            parts.Add("c " + ChannelSelector.NameOf(layout));
        if (layout.Z is { } z)
            parts.Add("z " + z.ToString(CultureInfo.InvariantCulture));
        if (layout.Time is { } t)
            parts.Add("t " + t.ToString(CultureInfo.InvariantCulture));
        if (layout.Extension is { } extension)
            parts.Add(extension);
        return parts.Count == 0 ? "-" : string.Join(' ', parts);
    }

    private static void Line(string label, string text) => Console.WriteLine($"  {label,-9} {text}".TrimEnd());
}
