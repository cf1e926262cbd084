using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>One line for every HDU of a file and for bytes behind the last one.</summary>
internal static class PartList
{
    private const string Carried = "carried";

    /// <summary>The parts of a file.</summary>
    public static IReadOnlyList<StackPart> Of(FitsReader reader)
    {
        HashSet<int> masksInUse = [.. reader.Hdus.SelectMany(hdu => hdu.Masks).Select(mask => mask.Index)];
        List<StackPart> parts = reader.Hdus.Select(hdu => Describe(hdu, masksInUse)).ToList();
        if (reader.HeaderIsTruncated)
            parts.Add(new StackPart(string.Create(CultureInfo.InvariantCulture, $"HDU {reader.Hdus.Count}"), "truncated inside its header", "unknown", "not carried"));
        else if (reader.BytesBehind > 0)
            parts.Add(new StackPart("bytes behind the last HDU", string.Create(CultureInfo.InvariantCulture, $"{reader.BytesBehind} bytes"), "not FITS", "not carried"));
        return parts;
    }

    /// <summary>A word for an HDU's kind.</summary>
    public static string KindName(Hdu hdu) => hdu.Kind switch
    {
        HduKind.Image => "image",
        HduKind.Empty => "empty",
        HduKind.Table => "table",
        HduKind.CompressedImage => $"image in compressed tiles ({hdu.Compression})",
        HduKind.RandomGroups => "random groups",
        _ => "extension of unknown type",
    };

    private static StackPart Describe(Hdu hdu, HashSet<int> masksInUse)
    {
        string shape = hdu.Kind switch
        {
            HduKind.Image => ImageLayout.Describe(hdu),
            HduKind.CompressedImage => $"{ImageLayout.Describe(hdu)} in compressed tiles ({hdu.Compression})",
            HduKind.Empty => "no data",
            HduKind.Table when hdu.Axes.Count == 2 => string.Create(CultureInfo.InvariantCulture, $"{hdu.Axes[1]} rows of {hdu.Axes[0]} bytes"),
            _ => string.Create(CultureInfo.InvariantCulture, $"{hdu.DataBytes} bytes"),
        };
        string role = hdu.Role switch
        {
            HduRole.Science => "science",
            HduRole.ErrorPlane => "error plane",
            HduRole.QualityMask => masksInUse.Contains(hdu.Index) ? "quality mask" : "quality mask of no frame here",
            HduRole.OtherImage => hdu.Axes.Count == 1 ? "array of one axis" : "other image",
            _ when ChangeMask.IsOurs(hdu) => "change mask of an earlier run",
            _ => KindName(hdu),
        };
        string fate = hdu switch
        {
            { Role: HduRole.Science, IsTruncated: true } => string.Create(CultureInfo.InvariantCulture, $"truncated; {hdu.Planes} whole frames filtered"),
            { IsTruncated: true } => "truncated; not carried",
            { Role: HduRole.Science } => "filtered",
            _ => Carried,
        };
        return new StackPart(hdu.Label, shape, role, fate);
    }
}
