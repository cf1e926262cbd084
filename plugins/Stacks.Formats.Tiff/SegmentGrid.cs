namespace Stacks.Formats.Tiff;

/// <summary>
/// How a page is cut into segments: strips (the page's width, RowsPerStrip rows, the last one shorter) or tiles (all of
/// one size, those at the right and lower edge padded). Segments are numbered row by row.
/// </summary>
/// <param name="Width">Samples in a row of the page.</param>
/// <param name="Height">Rows of the page.</param>
/// <param name="SegmentWidth">Samples in a row of a segment.</param>
/// <param name="SegmentHeight">Rows of a segment; of a strip that is not the last.</param>
/// <param name="SampleSize">Bytes of a sample.</param>
/// <param name="Tiled">True for tiles.</param>
internal readonly record struct SegmentGrid(int Width, int Height, int SegmentWidth, int SegmentHeight, int SampleSize, bool Tiled)
{
    /// <summary>Strips of about 256 KiB, at least one row each.</summary>
    public static SegmentGrid Strips(int width, int height, int sampleSize) =>
        new(width, height, width, (int)Math.Clamp(262144L / ((long)width * sampleSize), 1, height), sampleSize, false);

    /// <summary>Segments side by side.</summary>
    public long Across => (Width + (long)SegmentWidth - 1) / SegmentWidth;

    /// <summary>Segments in the page.</summary>
    public long Count => Across * ((Height + (long)SegmentHeight - 1) / SegmentHeight);

    /// <summary>Bytes of a row of a segment, decoded.</summary>
    public long RowBytes => (long)SegmentWidth * SampleSize;

    /// <summary>Rows a segment holds in the file.</summary>
    public int RowsOf(long segment) => Tiled ? SegmentHeight : (int)Math.Min(SegmentHeight, Height - (segment * SegmentHeight));

    /// <summary>Bytes of a segment, decoded.</summary>
    public long BytesOf(long segment) => RowBytes * RowsOf(segment);

    /// <summary>First column of a segment.</summary>
    public int Left(long segment) => (int)(segment % Across) * SegmentWidth;

    /// <summary>First row of a segment.</summary>
    public int Top(long segment) => (int)(segment / Across) * SegmentHeight;

    /// <summary><c>strip</c> or <c>tile</c>.</summary>
    public string Word => Tiled ? "tile" : "strip";
}
