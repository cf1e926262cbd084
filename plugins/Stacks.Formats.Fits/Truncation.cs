using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>What is said of a file that ends early: as a fault, or as what is missing of a file that is read all the same.</summary>
internal static class Truncation
{
    /// <summary>What a user can do.</summary>
    public const string Remedy = "copy the file again from where it was made, or take its whole frames with --salvage";

    /// <summary>An HDU is cut, and the file must be whole.</summary>
    /// <param name="hdu">The HDU.</param>
    /// <param name="frames">Whole frames up to its end.</param>
    public static StackFormatException Fault(Hdu hdu, long frames)
    {
        string where = hdu.Role == HduRole.Science && hdu.Tiles is null
            ? string.Create(CultureInfo.InvariantCulture, $"{hdu.Where}, frame {frames} at byte {FitsReader.OffsetOf(hdu, hdu.Planes)}")
            : string.Create(CultureInfo.InvariantCulture, $"{hdu.Where}, data at byte {hdu.DataOffset}");
        return new StackFormatException(where, "truncated: " + Ends(hdu), Remedy);
    }

    /// <summary>A header is cut, and the file must be whole.</summary>
    public static StackFormatException HeaderFault(FitsReader reader, int number) => new(
        string.Create(CultureInfo.InvariantCulture, $"{reader.Path}, HDU {number} at byte {reader.ScannedEnd}"),
        string.Create(CultureInfo.InvariantCulture, $"the file ends inside this header, at byte {reader.File.Length}"),
        Remedy);

    /// <summary>A sentence for each part that is missing.</summary>
    public static IEnumerable<string> Losses(FitsReader reader)
    {
        if (reader.File.Damage is { } damage)
            yield return damage;
        foreach (Hdu hdu in reader.Hdus.Where(h => h.IsTruncated))
        {
            string name = string.Create(CultureInfo.InvariantCulture, $"HDU {hdu.Index} ({hdu.Label})");
            if (hdu.Role != HduRole.Science)
                yield return $"{name} is missing: {Ends(hdu)}";
            else if (hdu.Planes < hdu.PromisedPlanes)
                yield return string.Create(CultureInfo.InvariantCulture, $"frames {hdu.FirstFrame + hdu.Planes} to {hdu.FirstFrame + hdu.PromisedPlanes - 1} are missing, the last {hdu.PromisedPlanes - hdu.Planes} of {hdu.PromisedPlanes} in {name}: {Ends(hdu)}");
        }

        if (reader.HeaderIsTruncated)
            yield return string.Create(CultureInfo.InvariantCulture, $"HDU {reader.Hdus.Count} and all that follows it are missing: the file ends inside its header, at byte {reader.File.Length}");
    }

    private static string Ends(Hdu hdu) => string.Create(
        CultureInfo.InvariantCulture,
        $"the file ends at byte {hdu.DataOffset + hdu.PresentBytes}, the header promises data to byte {(Int128)hdu.DataOffset + hdu.DataBytes}");
}
