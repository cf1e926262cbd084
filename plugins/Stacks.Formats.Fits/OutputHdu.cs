using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;

namespace Stacks.Formats.Fits;

/// <summary>
/// One HDU of the output that comes from the source: carried whole, with a new header over carried data, or with a new
/// header over frames.
/// </summary>
internal sealed record OutputHdu
{
    /// <summary>
    /// Makes the new header, without what is added at the end of the run; null when the HDU is carried byte for byte.
    /// Made when it is needed, and the same each time: the headers of thousands of extensions are not kept.
    /// </summary>
    public Func<List<FitsCard>>? MakeCards { get; init; }

    /// <summary>The HDU of the source whose data, or all of which, are carried; null when there are none.</summary>
    public Hdu? Carried { get; init; }

    /// <summary>Name for people.</summary>
    public required string Label { get; init; }

    /// <summary>Index of the first frame.</summary>
    public int FirstFrame { get; init; }

    /// <summary>Frames; 0 when the HDU holds none.</summary>
    public int Frames { get; init; }

    /// <summary>Axes of the image; frames only.</summary>
    public IReadOnlyList<long> Axes { get; init; } = [];

    /// <summary>Type of the samples; frames only.</summary>
    public SampleType SampleType { get; init; }

    /// <summary>How its frames are cut and compressed; null when they are not. The header is then turned into that of a table.</summary>
    public TilePlan? Tiles { get; init; }

    /// <summary>True for the HDU whose header gets the provenance of the run.</summary>
    public bool HoldsProvenance { get; init; }

    /// <summary>Bytes of its header.</summary>
    public long HeaderBytes { get; init; }

    /// <summary>Bytes of its data unit, without padding; 0 for compressed frames, whose size is known when they are written.</summary>
    public long DataBytes { get; init; }
}
