namespace Stacks.Formats.Tiff;

/// <summary>
/// Where the segments of one page at a time are; its memory is reused from page to page. For one thread. Without
/// compression a segment is as long as its samples, whatever longer count the file gives; a shorter one is kept, so that
/// the index finds it.
/// </summary>
internal sealed class SegmentTable(TiffFile file, FileWindow window)
{
    private long[] offsets = [];
    private long[] counts = [];

    /// <summary>A table with a window of its own.</summary>
    public SegmentTable(TiffFile file)
        : this(file, new FileWindow(file))
    {
    }

    /// <summary>Segments of the page.</summary>
    public int Length { get; private set; }

    /// <summary>Offset and bytes of a segment; numbers beyond 2^63 - 1 are held there.</summary>
    public (long Offset, long Count) this[int segment] => (offsets[segment], counts[segment]);

    /// <summary>Reads the table of a page.</summary>
    public void Load(in Page page)
    {
        PageLayout layout = page.Layout;
        Length = layout.Segments;
        if (offsets.Length < Length)
        {
            offsets = new long[Length];
            counts = new long[Length];
        }

        if (Length == 0)
            return;
        Load(page.OffsetsAt, layout.OffsetType, offsets);
        if (page.CountsAt >= 0)
            Load(page.CountsAt, layout.CountType, counts);
        if (layout is { Frame: not null, Compression: Compression.None })
        {
            for (int i = 0; i < Length; i++)
                counts[i] = page.CountsAt < 0 ? layout.Grid.BytesOf(i) : Math.Min(layout.Grid.BytesOf(i), counts[i]);
        }
    }

    private void Load(long at, FieldType type, long[] numbers)
    {
        int size = type.Size();
        ReadOnlySpan<byte> bytes = window.At(at, checked(Length * size));
        for (int i = 0; i < Length; i++)
            numbers[i] = file.Number(bytes.Slice(i * size, size));
    }
}
