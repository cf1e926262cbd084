using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// Decides by EXTNAME what an image is for (common practice; the standard names no roles), and which quality mask goes
/// with which science HDU.
/// </summary>
internal static class HduRoles
{
    private const StringComparison NoCase = StringComparison.OrdinalIgnoreCase;

    private static readonly string[] ErrorNames =
        ["ERR", "ERROR", "ERRORS", "SIGMA", "VAR", "VARIANCE", "STD", "STDDEV", "STDEV", "UNCERT", "UNCERTAINTY", "RMS", "NOISE", "IVAR", "WHT", "WEIGHT", "WGT"];

    private static readonly string[] ErrorPrefixes = ["VAR_", "ERR_", "SIGMA_", "STAT_"];
    private static readonly string[] MaskNames = ["DQ", "MASK", "QUALITY", "QUAL", "BPM", "BADPIX", "FLAG", "FLAGS"];

    /// <summary>What an image's name says it is. A mask holds integers.</summary>
    private static HduRole ByName(Hdu hdu)
    {
        if (!hdu.IsImage || ChangeMask.IsOurs(hdu))
            return HduRole.None;
        if (hdu.Axes.Count < 2)
            return HduRole.OtherImage;
        if (hdu.Name is not { } name)
            return HduRole.Science;
        if (ErrorNames.Any(n => name.Equals(n, NoCase)) || ErrorPrefixes.Any(p => name.StartsWith(p, NoCase)))
            return HduRole.ErrorPlane;
        if (MaskNames.Any(n => name.Equals(n, NoCase)))
            return hdu.BitPix > 0 ? HduRole.QualityMask : HduRole.OtherImage;
        return HduRole.Science;
    }

    /// <summary>
    /// True when an HDU is one that <c>NAME</c> or <c>NAME,VER</c> asks for, EXTVER being 1 where it is not given; one
    /// without a name is asked for by the label that it has in lists.
    /// </summary>
    public static bool Matches(Hdu hdu, string asked)
    {
        int comma = asked.LastIndexOf(',');
        bool hasVersion = comma > 0 && long.TryParse(asked.AsSpan(comma + 1).Trim(), NumberStyles.None, CultureInfo.InvariantCulture, out long version) && (hdu.Version ?? 1) == version;
        return (hdu.Name ?? hdu.Label).Equals(asked.Trim(), NoCase) || (hasVersion && asked[..comma].Trim().Equals(hdu.Name, NoCase));
    }

    /// <summary>
    /// Gives every HDU its final role. Where extensions are named, those alone are science; else, where any image is
    /// called SCI, only such images are; else every image that is neither an error plane nor a mask.
    /// </summary>
    /// <exception cref="StackFormatException">A name fits no extension, or one that is no image.</exception>
    public static void Assign(string path, List<Hdu> hdus, IReadOnlyList<string>? asked)
    {
        foreach (string name in asked ?? [])
        {
            if (!hdus.Any(h => Matches(h, name)))
                throw new StackFormatException(path, $"no extension '{name}'", $"there are: {string.Join("; ", hdus.Select(h => h.Label))}");
            if (!hdus.Any(h => Matches(h, name) && h.IsImage && h.Axes.Count >= 2))
                throw new StackFormatException(path, $"extension '{name}' holds no image", "name an image extension");
        }

        for (int i = 0; i < hdus.Count; i++)
            hdus[i] = hdus[i] with { Role = ByName(hdus[i]) };
        bool hasNamedScience = hdus.Any(h => h.Role == HduRole.Science && "SCI".Equals(h.Name, NoCase));
        for (int i = 0; i < hdus.Count; i++)
        {
            Hdu hdu = hdus[i];
            if (!hdu.IsImage || hdu.Axes.Count < 2)
                continue;
            bool isScience = asked is not null
                ? asked.Any(name => Matches(hdu, name))
                : hdu.Role == HduRole.Science && (!hasNamedScience || "SCI".Equals(hdu.Name, NoCase));
            if (isScience)
                hdus[i] = hdu with { Role = HduRole.Science };
            else if (hdu.Role == HduRole.Science)
                hdus[i] = hdu with { Role = HduRole.OtherImage };
        }
    }

    /// <summary>
    /// The masks of a science HDU: same width and height, one plane or as many as it has, and the same EXTVER; where
    /// the mask has no EXTVER, its place among the masks of its name and shape is that of the science HDU among those
    /// of this shape.
    /// </summary>
    public static IReadOnlyList<Hdu> MasksOf(Hdu science, IReadOnlyList<Hdu> hdus)
    {
        int place = hdus.Where(h => h.Role == HduRole.Science && SameShape(h, science)).TakeWhile(h => h.Index != science.Index).Count();
        List<Hdu> masks = [];
        foreach (IGrouping<string, Hdu> named in hdus.Where(h => h.Role == HduRole.QualityMask && SameShape(h, science)).GroupBy(h => h.Name!.ToUpperInvariant()))
        {
            Hdu? mask = named.All(m => m.Version is not null) && science.Version is { } version
                ? named.FirstOrDefault(m => m.Version == version)
                : named.ElementAtOrDefault(place);
            if (mask is not null && !mask.IsTruncated && (mask.Planes == 1 || mask.Planes == science.PromisedPlanes))
                masks.Add(mask);
        }

        return masks;
    }

    private static bool SameShape(Hdu a, Hdu b) => a.Axes[0] == b.Axes[0] && a.Axes[1] == b.Axes[1];
}
