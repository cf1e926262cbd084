using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>The compression schemes that are decoded, by their number in the Compression field.</summary>
internal enum Compression
{
    None = 1,
    Lzw = 5,
    Deflate = 8,
    PackBits = 32773,
    OldDeflate = 32946,
    Zstd = 50000,
}

/// <summary>Everything pages that are alike share; one instance for all of them.</summary>
internal sealed record PageLayout
{
    /// <summary>Stands for every page of a truncated file that is not whole.</summary>
    public static PageLayout Lost { get; } = new() { Carried = false, Segments = 0, OffsetType = default, CountType = default, Shape = "cut off by the end of the file" };

    /// <summary>Shape and sample type of each sample's plane; null for a thumbnail, whose bytes are carried as they stand.</summary>
    public FrameLayout? Frame { get; init; }

    /// <summary>Samples of a pixel, each a frame of its own; 0 for a thumbnail.</summary>
    public int Samples { get; init; }

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
    /// of at most 4096 - 258 bytes in 12 bits is below 2560. PackBits: 128 bytes in two. Zstandard: a block of 128 KiB in four
    /// (RFC 8878, section 3.1.1.2). A page that claims more is a bomb, known before it is read.
    /// </summary>
    public long LargestRatio => Compression switch
    {
        Compression.None => 1,
        Compression.Lzw => 2560,
        Compression.PackBits => 64,
        Compression.Zstd => 32768,
        _ => 1032,
    };

    /// <summary>Compression and predictor, for people.</summary>
    public string Coding
    {
        get
        {
            string scheme = Compression switch
            {
                Compression.None => "uncompressed",
                Compression.Lzw => "LZW",
                Compression.PackBits => "PackBits",
                Compression.Zstd => "Zstandard",
                _ => "Deflate",
            };
            return Predictor == 1 ? scheme : string.Create(CultureInfo.InvariantCulture, $"{scheme} with predictor {Predictor}");
        }
    }

    /// <summary>The layout of one sample's plane. A page of one sample has no channels of its own.</summary>
    public FrameLayout FrameOf(int sample) => Samples == 1 ? Frame! : Frame! with { Channel = sample };
}
