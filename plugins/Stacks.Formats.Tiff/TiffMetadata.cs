using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>What the first page says about the whole file: OME-XML, the XMP packet, and facts for people.</summary>
internal sealed class TiffMetadata
{
    private readonly TiffFile file;
    private readonly TiffDirectory directory;
    private readonly FileWindow window;

    /// <summary>Reads the fields of the first page that is whole.</summary>
    public TiffMetadata(TiffFile file, PageIndex index)
    {
        this.file = file;
        window = new FileWindow(file);
        directory = TiffDirectory.Read(file, window, index.Pages[index.FirstWhole].Directory, string.Create(CultureInfo.InvariantCulture, $"{file.Path}, page {index.FirstWhole}"));
        Ome = OmeXml.Read(Text(Tag.ImageDescription), Path.GetFileName(file.Path), out string? problem);
        OmeProblem = problem;
        if (Ome is { MetadataFile: null })
            Planes = OmePlanes.Assign(Ome.Images, index.Pages);
    }

    /// <summary>The OME-XML; null where there is none that can be read.</summary>
    public OmeXml? Ome { get; }

    /// <summary>Why OME-XML cannot be read; null when it can or there is none.</summary>
    public string? OmeProblem { get; }

    /// <summary>Place of each page in its OME image; null where no OME-XML gives places.</summary>
    public OmePlane?[]? Planes { get; }

    /// <summary>The XMP packet's bytes; null where there is none.</summary>
    public byte[]? Xmp => directory.Find(Tag.Xmp) is { Count: > 0 } packet && packet.ByteLength <= Array.MaxLength ? Bytes(packet) : null;

    /// <summary>The layout of a sample's plane with its place in the OME image, where samples of a pixel are channels that follow each other.</summary>
    public FrameLayout Layout(PageLayout pageLayout, int page, int sample)
    {
        FrameLayout layout = pageLayout.FrameOf(sample);
        if (Planes?[page] is not { } plane)
            return layout;
        return OmePlanes.Place(layout, plane, sample, Ome!.Images.Count > 1);
    }

    /// <summary>Header facts for people, in a fixed order.</summary>
    public IReadOnlyList<HeaderFact> Facts(PageLayout firstScience)
    {
        List<HeaderFact> facts =
        [
            new("container", $"{(file.IsBig ? "BigTIFF" : "classic TIFF")}, {(file.BigEndian ? "big-endian" : "little-endian")}, {firstScience.Coding}"),
        ];
        if (firstScience.Photometric == 0)
            facts.Add(new("photometric interpretation", "white is zero: larger samples are darker; samples are taken as stored, not inverted"));
        if (firstScience.Photometric == 2)
            facts.Add(new("photometric interpretation", "RGB colour: red, green and blue are channels 0, 1 and 2; samples are taken as stored"));
        if (!firstScience.Frame!.Lattice.IsSingle)
            facts.Add(new("colour-filter mosaic", string.Create(CultureInfo.InvariantCulture, $"repeats every {firstScience.Frame.Lattice.PeriodX} x {firstScience.Frame.Lattice.PeriodY} pixels")));
        foreach ((string label, ushort tag) in new[] { ("made by", Tag.Software), ("date", Tag.DateTime), ("camera maker", Tag.Make), ("camera", Tag.Model) })
        {
            if (Text(tag) is { Length: > 0 } text)
                facts.Add(new(label, text));
        }

        if (Resolution() is { } resolution)
            facts.Add(new("resolution", resolution));
        facts.AddRange(Ome?.Facts() ?? []);
        return facts;
    }

    private string Text(ushort tag) =>
        directory.Find(tag) is { Type: FieldType.Ascii or FieldType.Byte or FieldType.Undefined } field && field.ByteLength <= Array.MaxLength
            ? XmlText.Decode(Bytes(field)).Trim()
            : "";

    private byte[] Bytes(TiffField field)
    {
        byte[] bytes = new byte[field.ByteLength];
        file.Read(field.ValueAt, bytes);
        return bytes;
    }

    private string? Resolution()
    {
        if (directory.Find(Tag.XResolution) is not { Type: FieldType.Rational, Count: > 0 } x
            || directory.Find(Tag.YResolution) is not { Type: FieldType.Rational, Count: > 0 } y)
            return null;
        string unit = directory.Number(window, Tag.ResolutionUnit, 2) switch { 2 => "pixels per inch", 3 => "pixels per cm", _ => "pixels per unit" };
        return string.Create(CultureInfo.InvariantCulture, $"{Ratio(x):R} x {Ratio(y):R} {unit}");
    }

    private double Ratio(TiffField field)
    {
        ReadOnlySpan<byte> bytes = window.At(field.ValueAt, 8);
        return (double)file.Number(bytes[..4]) / file.Number(bytes[4..]);
    }
}
