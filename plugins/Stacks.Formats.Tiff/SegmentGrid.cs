namespace Stacks.Formats.Tiff;

/// <summary>
/// How a page is cut into segments: strips (the page's width, RowsPerStrip rows, the last one shorter) or tiles (all of
/// one size, those at the right and lower edge padded). Segments are numbered row by row. A page of several samples a
/// pixel holds them side by side in each segment (chunky), or all segments of one sample and then those of the next
/// (planar).
/// </summary>
/// <param name="Width">Pixels in a row of the page.</param>
/// <param name="Height">Rows of the page.</param>
/// <param name="SegmentWidth">Pixels in a row of a segment.</param>
/// <param name="SegmentHeight">Rows of a segment; of a strip that is not the last.</param>
/// <param name="SampleSize">Bytes of a sample.</param>
/// <param name="Tiled">True for tiles.</param>
/// <param name="Chunk">Samples of a pixel that stand side by side.</param>
/// <param name="Planes">Planes that follow each other; 1 where <paramref name="Chunk"/> is more.</param>
internal readonly record struct SegmentGrid(int Width, int Height, int SegmentWidth, int SegmentHeight, int SampleSize, bool Tiled, int Chunk = 1, int Planes = 1)
{
    /// <summary>Strips of about 256 KiB, at least one row each.</summary>
    public static SegmentGrid Strips(int width, int height, int sampleSize) =>
        new(width, height, width, (int)Math.Clamp(262144L / ((long)width * sampleSize), 1, height), sampleSize, false);

    /// <summary>Segments side by side.</summary>
    public long Across => (Width + (long)SegmentWidth - 1) / SegmentWidth;

    /// <summary>Segments of one plane; of all samples in a chunky page.</summary>
    public long PlaneCount => Across * ((Height + (long)SegmentHeight - 1) / SegmentHeight);

    /// <summary>Segments in the page.</summary>
    public long Count => PlaneCount * Planes;

    /// <summary>Bytes of a row of a segment, decoded.</summary>
    public long RowBytes => (long)SegmentWidth * SampleSize * Chunk;

    /// <summary>The first segment that holds a sample of the pixels; <see cref="PlaneCount"/> of them do.</summary>
    public long First(int sample) => Planes == 1 ? 0 : sample * PlaneCount;

    /// <summary>Rows a segment holds in the file.</summary>
    public int RowsOf(long segment) => Tiled ? SegmentHeight : (int)Math.Min(SegmentHeight, Height - (segment % PlaneCount * SegmentHeight));

    /// <summary>Bytes of a segment, decoded.</summary>
    public long BytesOf(long segment) => RowBytes * RowsOf(segment);

    /// <summary>First column of a segment.</summary>
    public int Left(long segment) => (int)(segment % Across) * SegmentWidth;

    /// <summary>First row of a segment.</summary>
    public int Top(long segment) => (int)(segment % PlaneCount / Across) * SegmentHeight;

    /// <summary><c>strip</c> or <c>tile</c>.</summary>
    public string Word => Tiled ? "tile" : "strip";
}
