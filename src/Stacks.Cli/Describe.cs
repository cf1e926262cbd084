using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Cli;

/// <summary>Layouts and counts in words.</summary>
internal static class Describe
{
    /// <summary><c>1 frame</c>, <c>16 frames</c>.</summary>
    public static string Frames(int count) => Count(count, "frame");

    /// <summary>A count with its noun, in the plural where it is not 1.</summary>
    public static string Count(long count, string noun) => string.Create(CultureInfo.InvariantCulture, $"{count} {noun}{(count == 1 ? "" : "s")}");

    /// <summary>How results are compressed.</summary>
    public static string Name(OutputCompression compression) => compression switch
    {
        OutputCompression.None => "not compressed",
        OutputCompression.Lossless => "compressed losslessly",
        OutputCompression.Deflate => "compressed with Deflate",
        _ => "compressed with Zstandard",
    };

    /// <summary>Shape, sample type and what else is known of a frame.</summary>
    public static string Layout(FrameLayout layout)
    {
        List<string> parts = [Shape(layout)];
        if (layout.Extension is not null)
            parts.Add("extension " + layout.Extension);
        if (!layout.Transform.IsIdentity)
            parts.Add(string.Create(CultureInfo.InvariantCulture, $"value = {layout.Transform.Zero:R} + {layout.Transform.Scale:R} x stored"));
        if (layout.ChannelName is not null || layout.Channel is not null)
            parts.Add("channel " + (layout.ChannelName ?? Number(layout.Channel!.Value)));
        if (!layout.Lattice.IsSingle)
            parts.Add(string.Create(CultureInfo.InvariantCulture, $"colour-filter mosaic of period {layout.Lattice.PeriodX} x {layout.Lattice.PeriodY}"));
        if (layout.SaturationStored is { } saturation)
            parts.Add("saturated from " + Number(layout.Transform.ToValue(saturation)));
        if (layout.Blank is { } blank)
            parts.Add("missing where stored " + blank.ToString(CultureInfo.InvariantCulture));
        if (layout.QuantisationStep > 0)
            parts.Add("steps of " + Number(layout.QuantisationStep));
        return string.Join(", ", parts);
    }

    /// <summary><c>512 x 512 uint16 in ADU</c>.</summary>
    public static string Shape(FrameLayout layout) =>
        string.Create(CultureInfo.InvariantCulture, $"{layout.Width} x {layout.Height} {layout.SampleType.Name()} in {layout.Unit}");

    /// <summary>The same for machines.</summary>
    public static object LayoutFacts(FrameLayout layout) => new
    {
        layout.Width,
        layout.Height,
        SampleType = layout.SampleType.Name(),
        layout.Unit,
        layout.Transform.Scale,
        layout.Transform.Zero,
        Blank = layout.Blank?.ToString(CultureInfo.InvariantCulture),
        layout.QuantisationStep,
        Saturation = layout.SaturationStored is { } s ? layout.Transform.ToValue(s) : (double?)null,
        MosaicPeriodX = layout.Lattice.PeriodX,
        MosaicPeriodY = layout.Lattice.PeriodY,
        layout.Channel,
        layout.ChannelName,
        layout.Extension,
    };

    /// <summary>Name of a work type.</summary>
    public static string Name(WorkType type) => type switch
    {
        WorkType.UInt16 => "uint16",
        WorkType.Int16 => "int16",
        WorkType.Float32 => "float32",
        _ => "float64",
    };

    /// <summary>A number in six digits.</summary>
    public static string Number(double number) => number.ToString("G6", CultureInfo.InvariantCulture);

    /// <summary>A measured number or a share, in four digits.</summary>
    public static string Short(double number) => number.ToString("G4", CultureInfo.InvariantCulture);
}
