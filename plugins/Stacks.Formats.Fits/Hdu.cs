using System.Globalization;
using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;

namespace Stacks.Formats.Fits;

/// <summary>What a header-data unit is by its own header.</summary>
internal enum HduKind
{
    /// <summary>An array of at least one sample: the primary array or an IMAGE extension.</summary>
    Image,

    /// <summary>A primary array or IMAGE extension without samples.</summary>
    Empty,

    /// <summary>TABLE or BINTABLE.</summary>
    Table,

    /// <summary>A BINTABLE that holds an image in compressed tiles (ZIMAGE = T).</summary>
    CompressedImage,

    /// <summary>Random groups (GROUPS = T).</summary>
    RandomGroups,

    /// <summary>An extension of another type.</summary>
    Other,
}

/// <summary>What the reader takes an HDU for.</summary>
internal enum HduRole
{
    /// <summary>Its planes are science frames.</summary>
    Science,

    /// <summary>Standard deviations, variances or weights.</summary>
    ErrorPlane,

    /// <summary>Flags; non-zero is missing.</summary>
    QualityMask,

    /// <summary>An image that is neither.</summary>
    OtherImage,

    /// <summary>Not an image.</summary>
    None,
}

/// <summary>Where one HDU stands in its file and what it holds; no samples and no cards.</summary>
internal sealed record Hdu
{
    /// <summary>0 for the primary HDU.</summary>
    public required int Index { get; init; }

    /// <summary>File and HDU, for errors.</summary>
    public required string Where { get; init; }

    /// <summary>Kind.</summary>
    public required HduKind Kind { get; init; }

    /// <summary>BITPIX; that of the image where it is compressed.</summary>
    public required int BitPix { get; init; }

    /// <summary>NAXIS1, NAXIS2, ...; those of the image where it is compressed.</summary>
    public required IReadOnlyList<long> Axes { get; init; }

    /// <summary>EXTNAME; null when there is none.</summary>
    public required string? Name { get; init; }

    /// <summary>EXTVER; null when there is none.</summary>
    public required long? Version { get; init; }

    /// <summary>Offset of the header.</summary>
    public required long HeaderOffset { get; init; }

    /// <summary>Offset of the data unit.</summary>
    public required long DataOffset { get; init; }

    /// <summary>Bytes of the data unit as the header gives them, without padding.</summary>
    public required long DataBytes { get; init; }

    /// <summary>Bytes of the data unit that are in the file: fewer than <see cref="DataBytes"/> when it is truncated.</summary>
    public required long PresentBytes { get; init; }

    /// <summary>ZCMPTYPE; compressed images only.</summary>
    public string? Compression { get; init; }

    /// <summary>Role.</summary>
    public HduRole Role { get; init; } = HduRole.None;

    /// <summary>Layout of its planes; science images and quality masks only.</summary>
    public FrameLayout? Layout { get; init; }

    /// <summary>Where its tiles are and how they are compressed; compressed science images and quality masks only.</summary>
    public TiledImage? Tiles { get; init; }

    /// <summary>Planes whose tiles are all in a truncated file; compressed science images only.</summary>
    public long WholePlanes { get; init; }

    /// <summary>Index in the stack of its first plane; science only.</summary>
    public int FirstFrame { get; init; }

    /// <summary>The quality masks that flag its planes; science only.</summary>
    public IReadOnlyList<Hdu> Masks { get; init; } = [];

    /// <summary>True for an image, compressed or not.</summary>
    public bool IsImage => Kind is HduKind.Image or HduKind.CompressedImage;

    /// <summary>True when the file ends inside the data unit.</summary>
    public bool IsTruncated => PresentBytes < DataBytes;

    /// <summary>Offset of the block after the data unit.</summary>
    public long EndOffset => DataOffset + FitsBlock.Padded(DataBytes);

    /// <summary><c>SCI,2</c>, <c>SCI</c>, <c>primary</c> or <c>HDU 3</c>.</summary>
    public string Label => (Name, Version, Index) switch
    {
        (null, _, 0) => "primary",
        (null, _, _) => string.Create(CultureInfo.InvariantCulture, $"HDU {Index}"),
        (_, null, _) => Name,
        _ => string.Create(CultureInfo.InvariantCulture, $"{Name},{Version}"),
    };

    /// <summary>Bytes of one plane; images only.</summary>
    public long PlaneBytes => Axes[0] * Axes[1] * (Math.Abs(BitPix) / 8);

    /// <summary>Planes that the header promises; images of two and more axes only.</summary>
    public long PromisedPlanes => Axes.Skip(2).Aggregate(1L, (product, axis) => product * axis);

    /// <summary>Whole planes in the file; images of two and more axes only.</summary>
    public long Planes => !IsTruncated ? PromisedPlanes : Tiles is null ? PresentBytes / PlaneBytes : WholePlanes;

    /// <summary><c>300 x 200 x 5</c>.</summary>
    public string Shape => string.Join(" x ", Axes.Select(a => a.ToString(CultureInfo.InvariantCulture)));
}
