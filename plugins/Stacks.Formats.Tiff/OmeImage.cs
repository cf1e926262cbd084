using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>One TiffData element.</summary>
/// <param name="Ifd">Page of the first plane, from 0.</param>
/// <param name="Planes">Planes it covers; null for all there are.</param>
/// <param name="C">Channel of the first plane.</param>
/// <param name="Z">Place along z of the first plane.</param>
/// <param name="T">Time of the first plane.</param>
/// <param name="OtherFile">Name (or UUID) of the file the planes stand in; null for this one.</param>
internal readonly record struct OmeTiffData(int Ifd, int? Planes, int C, int Z, int T, string? OtherFile)
{
    /// <summary>UUID of the other file; null where the element has none.</summary>
    public string? OtherUuid { get; init; }

    /// <summary>Where the element stands, from its first to its last bracket.</summary>
    public TextSpan At { get; init; }

    /// <summary>Its name with the prefix of its namespace.</summary>
    public string Name { get; init; } = "TiffData";
}

/// <summary>An Image element with its Pixels.</summary>
internal sealed class OmeImage
{
    /// <summary>Name, else ID.</summary>
    public string Name { get; set; } = "";

    /// <summary>When the image was taken, as written; null where it is not said.</summary>
    public string? AcquisitionDate { get; set; }

    /// <summary>DimensionOrder: XY and then C, Z and T, the fastest first.</summary>
    public string DimensionOrder { get; set; } = "XYZCT";

    /// <summary>Channels, planes along z, and times.</summary>
    public (int C, int Z, int T) Size { get; set; } = (1, 1, 1);

    /// <summary>Type of the pixels (<c>uint16</c>, <c>float</c>).</summary>
    public string Type { get; set; } = "";

    /// <summary>Where the type stands.</summary>
    public TextSpan? TypeAt { get; set; }

    /// <summary>Bits of a sample that mean something; null where it is not said.</summary>
    public int? SignificantBits { get; set; }

    /// <summary>Where they stand.</summary>
    public TextSpan? SignificantBitsAt { get; set; }

    /// <summary>Size of a pixel and time between planes, as written, with units.</summary>
    public List<(string Label, string Value)> Scales { get; } = [];

    /// <summary>Name of each Channel element, which stands for a channel or for all samples of a pixel; null where it has none.</summary>
    public List<string?> ChannelNames { get; } = [];

    /// <summary>Samples of a pixel, which share a page and are channels that follow each other; set when the pages are known.</summary>
    public int Samples { get; set; } = 1;

    /// <summary>Where the planes are.</summary>
    public List<OmeTiffData> TiffData { get; } = [];
}

/// <summary>What a page is in its image.</summary>
/// <param name="Image">The image.</param>
/// <param name="C">Channel of its first sample.</param>
/// <param name="Z">Place along z.</param>
/// <param name="T">Time.</param>
internal readonly record struct OmePlane(OmeImage Image, int C, int Z, int T);

/// <summary>Gives each page its place (OME-TIFF specification, "The TiffData element").</summary>
internal static class OmePlanes
{
    /// <summary>Honest elements name a page once; the bound ends hostile ones.</summary>
    public const int MostPerPage = 4;

    /// <summary>
    /// A TiffData element covers pages from Ifd on; their places follow DimensionOrder from (C, Z, T) on. Pages that no
    /// element covers have none. An image without any TiffData element has its planes in order.
    /// </summary>
    public static OmePlane?[] Assign(IReadOnlyList<OmeImage> images, IReadOnlyList<Page> pages)
    {
        OmePlane?[] planes = new OmePlane?[pages.Count];
        int usual = pages.First(p => p.Layout.Samples > 0).Layout.Samples;
        long budget = (long)MostPerPage * pages.Count;
        foreach (OmeImage image in images)
        {
            OmeTiffData[] own = [.. (image.TiffData.Count > 0 ? image.TiffData : [new OmeTiffData(0, null, 0, 0, 0, null)]).Where(d => d.OtherFile is null)];
            int first = own.Length > 0 && own[0].Ifd < pages.Count ? pages[own[0].Ifd].Layout.Samples : 0;
            image.Samples = first > 0 ? first : usual;
            foreach (OmeTiffData data in own)
                Assign(image, data, planes, ref budget);
        }

        return planes;
    }

    /// <summary>The planes of each TiffData element, by its place, with their pages' new numbers.</summary>
    /// <param name="images">The images.</param>
    /// <param name="numbers">New number of each page of the file; negative for one that is left out.</param>
    public static ILookup<TextSpan, (int Page, OmePlane Plane)> Renumbered(IReadOnlyList<OmeImage> images, int[] numbers) => images
        .SelectMany(image => image.TiffData.SelectMany(data => Of(image, data, numbers.Length).Select(p => (data.At, Page: numbers[p.Page], p.Plane))))
        .Take(MostPerPage * numbers.Length)
        .Where(p => p.Page >= 0)
        .ToLookup(p => p.At, p => (p.Page, p.Plane));

    private static void Assign(OmeImage image, OmeTiffData data, OmePlane?[] planes, ref long budget)
    {
        foreach ((int page, OmePlane plane) in Of(image, data, planes.Length))
        {
            if (budget-- <= 0)
                return;
            planes[page] = plane;
        }
    }

    /// <summary>The pages that an element covers in a file of so many, with their places.</summary>
    public static IEnumerable<(int Page, OmePlane Plane)> Of(OmeImage image, OmeTiffData data, int pages)
    {
        (long fast, long middle, long slow) = SizeInOrder(image);
        (long f, long m, long s) = InOrder(image, (data.C, data.Z, data.T));
        Int128 total = (Int128)fast * middle * slow;
        Int128 first = f + ((Int128)fast * (m + ((Int128)middle * s)));
        int wanted = data.Planes ?? int.MaxValue;
        for (int i = 0; i < wanted && first + i < total && data.Ifd + (long)i < pages; i++)
        {
            Int128 place = first + i;
            (int C, int Z, int T) at = default;
            Set(ref at, image.DimensionOrder[2], (int)(place % fast));
            Set(ref at, image.DimensionOrder[3], (int)(place / fast % middle));
            Set(ref at, image.DimensionOrder[4], (int)(place / fast / middle));
            yield return (data.Ifd + i, new OmePlane(image, at.C * image.Samples, at.Z, at.T));
        }
    }

    /// <summary>The number of a plane in its image, in DimensionOrder.</summary>
    public static Int128 Number(OmePlane plane)
    {
        (long fast, long middle, _) = SizeInOrder(plane.Image);
        (long f, long m, long s) = InOrder(plane.Image, (plane.C, plane.Z, plane.T));
        return f + ((Int128)fast * (m + ((Int128)middle * s)));
    }

    /// <summary>The layout of a sample's plane with its place in the image; samples of a pixel are channels that follow each other.</summary>
    /// <param name="layout">The page's own layout.</param>
    /// <param name="plane">The page's place.</param>
    /// <param name="sample">Number of the sample in its pixel.</param>
    /// <param name="isNamed">True to name the image, where there are several.</param>
    public static FrameLayout Place(FrameLayout layout, OmePlane plane, int sample, bool isNamed)
    {
        OmeImage image = plane.Image;
        int channel = plane.C + sample;
        int element = (long)image.ChannelNames.Count * image.Samples <= image.Size.C ? channel / image.Samples : channel;
        return layout with
        {
            Channel = channel,
            ChannelName = element < image.ChannelNames.Count ? image.ChannelNames[element] : null,
            Z = plane.Z,
            Time = plane.T,
            Extension = isNamed ? image.Name : null,
            SaturationStored = Saturation(layout.SampleType, image.SignificantBits),
        };
    }

    /// <summary>Saturation is the largest number that fits: 2^bits - 1, one bit less in signed types.</summary>
    private static double? Saturation(SampleType type, int? significantBits)
    {
        if (!type.IsInteger())
            return null;
        bool signed = type.Minimum() < 0;
        return significantBits is { } bits && bits >= 1 && bits < 8 * type.Size() ? Math.Pow(2, signed ? bits - 1 : bits) - 1 : type.Maximum();
    }

    private static void Set(ref (int C, int Z, int T) place, char axis, int index)
    {
        switch (axis)
        {
            case 'C': place.C = index; break;
            case 'Z': place.Z = index; break;
            default: place.T = index; break;
        }
    }

    private static (long Fast, long Middle, long Slow) SizeInOrder(OmeImage image) =>
        InOrder(image, image.Size with { C = Math.Max(image.Size.C, image.Samples) });

    /// <summary>Sizes or a place in pages, in DimensionOrder: OME-XML counts every sample as a channel.</summary>
    private static (long Fast, long Middle, long Slow) InOrder(OmeImage image, (int C, int Z, int T) by)
    {
        int Along(char axis) => axis switch { 'C' => by.C / image.Samples, 'Z' => by.Z, _ => by.T };
        return (Along(image.DimensionOrder[2]), Along(image.DimensionOrder[3]), Along(image.DimensionOrder[4]));
    }
}
