using System.Collections.Concurrent;
using System.Globalization;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>Reads a TIFF stack: every page that is not a thumbnail is a science frame, in the order of the file.</summary>
internal sealed class TiffReader : IStackReader
{
    private readonly ConcurrentBag<SegmentTable> tables = [];
    private readonly int[] pageOf;

    private TiffReader(TiffFormat format, TiffFile file, PageIndex index)
    {
        Format = format;
        File = file;
        Index = index;
        Metadata = new TiffMetadata(file, index);
        pageOf = [.. Enumerable.Range(0, index.Pages.Count).Where(p => index.Pages[p].Layout.Frame is not null)];
        if (pageOf.Length == 0)
            throw new StackFormatException(file.Path, "the file holds thumbnails only", "name the file they were made from");
    }

    /// <inheritdoc/>
    public string Path => File.Path;

    /// <inheritdoc/>
    public IStackFormat Format { get; }

    /// <inheritdoc/>
    public int FrameCount => pageOf.Length;

    /// <inheritdoc/>
    public IReadOnlyList<StackPart> Parts => TiffParts.Of(this);

    /// <inheritdoc/>
    public IReadOnlyList<HeaderFact> Facts => Metadata.Facts(PageOf(0).Layout);

    /// <summary>The open file.</summary>
    internal TiffFile File { get; }

    /// <summary>Its pages.</summary>
    internal PageIndex Index { get; }

    /// <summary>What the first page says about the whole file.</summary>
    internal TiffMetadata Metadata { get; }

    /// <summary>Opens a file and walks over its pages.</summary>
    public static TiffReader Open(TiffFormat format, string path, ReadOptions options)
    {
        TiffFile file = TiffFile.Open(path);
        try
        {
            if (options.Extensions is { Count: > 0 } names)
                throw new StackFormatException(path, $"the recipe names the extension {names[0]}, a TIFF file has none", "leave extensions out of the recipe's [input]");
            return new TiffReader(format, file, PageIndex.Walk(file, options.AllowTruncated));
        }
        catch
        {
            file.Dispose();
            throw;
        }
    }

    /// <inheritdoc/>
    public FrameLayout Layout(int frame) => Metadata.Layout(PageOf(frame).Layout.Frame!, pageOf[frame]);

    /// <inheritdoc/>
    public HeaderNoise NoiseOf(int frame) => new(null, null, null, "TIFF has no fields for gain, read noise or pedestal", null);

    /// <inheritdoc/>
    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation) => TiffHealth.Check(this, cancellation);

    /// <inheritdoc/>
    public void Read(int frame, ByteBuffer raw)
    {
        if (!tables.TryTake(out SegmentTable? table))
            table = new SegmentTable(File);
        table.Load(PageOf(frame));
        int header = 4 * table.Length;
        long total = header;
        for (int i = 0; i < table.Length; i++)
            total += table[i].Count;
        Span<byte> bytes = raw.Resize(checked((int)total));
        Span<int> counts = MemoryMarshal.Cast<byte, int>(bytes[..header]);
        Span<byte> data = bytes[header..];
        for (int i = 0, done = 0; i < table.Length;)
        {
            // Segments that follow each other in the file are read at once.
            (long start, _) = table[i];
            int length = 0;
            for (; i < table.Length && table[i].Offset == start + length; i++)
            {
                counts[i] = (int)table[i].Count;
                length += counts[i];
            }

            File.Read(start, data.Slice(done, length));
            done += length;
        }

        tables.Add(table);
    }

    /// <inheritdoc/>
    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        PageLayout layout = PageOf(frame).Layout;
        int at = 4 * layout.Segments;
        ReadOnlySpan<int> counts = MemoryMarshal.Cast<byte, int>(raw[..at]);
        for (int i = 0; i < counts.Length; i++)
        {
            string? problem = SegmentCodec.Decode(layout, File.BigEndian, i, raw.Slice(at, counts[i]), stored);
            if (problem is not null)
                throw new StackFormatException(WhereIs(frame, i), problem, "copy the file again from its source");
            at += counts[i];
        }
    }

    /// <inheritdoc/>
    public bool MarkQuality(int frame, Plane<SampleFlags> flags) => false;

    /// <inheritdoc/>
    public void Dispose() => File.Dispose();

    /// <summary>Number of the page a frame stands in.</summary>
    internal int PageNumber(int frame) => pageOf[frame];

    /// <summary>True when the frame's image data are compressed.</summary>
    internal bool IsCompressed(int frame) => PageOf(frame).Layout.Compression != Compression.None;

    private Page PageOf(int frame) => Index.Pages[pageOf[frame]];

    private string WhereIs(int frame, int segment)
    {
        SegmentTable table = new(File);
        table.Load(PageOf(frame));
        return string.Create(CultureInfo.InvariantCulture, $"{Path}, page {pageOf[frame]}, {PageOf(frame).Layout.Grid.Word} {segment}, byte {table[segment].Offset}");
    }
}
