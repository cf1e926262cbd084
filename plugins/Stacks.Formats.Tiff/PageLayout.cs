using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>The compression schemes that are decoded, by their number in the Compression field.</summary>
internal enum Compression
{
    None = 1,
    Lzw = 5,
    Deflate = 8,
    OldDeflate = 32946,
}

/// <summary>Everything pages that are alike share; one instance for all of them.</summary>
internal sealed record PageLayout
{
    /// <summary>Shape and sample type; null for a thumbnail, whose bytes are carried as they stand.</summary>
    public FrameLayout? Frame { get; init; }

    /// <summary>Strips or tiles; undefined for a thumbnail.</summary>
    public SegmentGrid Grid { get; init; }

    /// <summary>Compression of the segments; undefined for a thumbnail.</summary>
    public Compression Compression { get; init; }

    /// <summary>1 none, 2 horizontal differences, 3 floating point.</summary>
    public int Predictor { get; init; } = 1;

    /// <summary>Photometric interpretation as stored.</summary>
    public int Photometric { get; init; }

    /// <summary>False for a thumbnail that cannot be carried, because its image data point to places of their own.</summary>
    public bool Carried { get; init; } = true;

    /// <summary>Segments the directory lists and the page needs.</summary>
    public required int Segments { get; init; }

    /// <summary>Type of the segments' offsets.</summary>
    public required FieldType OffsetType { get; init; }

    /// <summary>Type of the segments' byte counts; undefined where the page has none.</summary>
    public required FieldType CountType { get; init; }

    /// <summary>Size and type, for people.</summary>
    public required string Shape { get; init; }

    /// <summary>
    /// The most bytes one compressed byte can stand for. Deflate: 258 bytes in two bits (RFC 1951) is 1032. LZW: strings
    /// of at most 4096 - 258 bytes in 12 bits is below 2560. A page that claims more is a bomb, known before it is read.
    /// </summary>
    public long LargestRatio => Compression switch
    {
        Compression.None => 1,
        Compression.Lzw => 2560,
        _ => 1032,
    };

    /// <summary>Compression and predictor, for people.</summary>
    public string Coding => (Compression, Predictor) switch
    {
        (Compression.None, _) => "uncompressed",
        (Compression.Lzw, 1) => "LZW",
        (Compression.Lzw, _) => string.Create(CultureInfo.InvariantCulture, $"LZW with predictor {Predictor}"),
        (_, 1) => "Deflate",
        _ => string.Create(CultureInfo.InvariantCulture, $"Deflate with predictor {Predictor}"),
    };
}
