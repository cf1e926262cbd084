using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Headers for frames that come from a file of another format.</summary>
internal static class NewHeader
{
    /// <summary>EXTNAME of frames that are not alike and stand in extensions of their own; EXTVER counts them from 1.</summary>
    public const string ExtensionName = "FRAME";

    /// <summary>True when two frames fit into one image.</summary>
    public static bool IsAlike(FrameLayout a, FrameLayout b) =>
        a.Width == b.Width && a.Height == b.Height && a.SampleType == b.SampleType && a.Transform == b.Transform && a.Blank == b.Blank && a.Unit == b.Unit;

    /// <summary>A primary header over frames.</summary>
    public static List<FitsCard> Primary(IReadOnlyList<long> axes, FrameLayout layout, SampleType type) =>
        [FitsCard.Logical("SIMPLE", true, "FITS Standard 4.0"), .. Array(axes, type), .. Meaning(layout, type)];

    /// <summary>A primary header without data.</summary>
    public static List<FitsCard> EmptyPrimary() => [FitsCard.Logical("SIMPLE", true, "FITS Standard 4.0"), .. Array([], SampleType.UInt8)];

    /// <summary>The header of an extension with one frame.</summary>
    public static List<FitsCard> Extension(IReadOnlyList<long> axes, FrameLayout layout, SampleType type, int version) =>
    [
        .. FitsCard.Text("XTENSION", "IMAGE", "image extension"),
        .. Array(axes, type),
        FitsCard.Integer("PCOUNT", 0, ""),
        FitsCard.Integer("GCOUNT", 1, ""),
        .. FitsCard.Text("EXTNAME", ExtensionName, "a frame of the source"),
        FitsCard.Integer("EXTVER", version, "its number, from 1"),
        .. Meaning(layout, type),
    ];

    private static IEnumerable<FitsCard> Array(IReadOnlyList<long> axes, SampleType type) =>
    [
        FitsCard.Integer("BITPIX", SampleEncoding.BitPix(type), "bits of a sample"),
        FitsCard.Integer("NAXIS", axes.Count, "axes"),
        .. axes.Select((axis, i) => FitsCard.Integer(string.Create(CultureInfo.InvariantCulture, $"NAXIS{i + 1}"), axis, i < 2 ? "" : "frames")),
    ];

    /// <summary>Scaling and BLANK as in the source while the type is the source's; else samples are values.</summary>
    private static IEnumerable<FitsCard> Meaning(FrameLayout layout, SampleType type)
    {
        bool isSame = type == layout.SampleType;
        if (isSame && !layout.Transform.IsIdentity)
        {
            // Scaled samples of a type that needs BZERO for its sign: value = zero + scale * (stored + shift).
            yield return FitsCard.Number("BSCALE", layout.Transform.Scale, "");
            yield return FitsCard.Number("BZERO", layout.Transform.ToValue((double)SampleEncoding.Shift(type)), "");
        }
        else if (SampleEncoding.Shift(type) != 0)
        {
            foreach (FitsCard card in HeaderEdit.Shift(type))
                yield return card;
        }

        if (isSame && layout.Blank is { } blank)
            yield return FitsCard.Integer("BLANK", blank - SampleEncoding.Shift(type), "stored value of missing samples");
        if (layout.Unit != "ADU")
        {
            foreach (FitsCard card in FitsCard.Text("BUNIT", layout.Unit, "unit of the values"))
                yield return card;
        }
    }
}
