using System.Collections.Concurrent;
using System.Globalization;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// Reads a TIFF stack: every sample of every page that is not a thumbnail is a science frame, in the order of the file,
/// and on a page of several samples a pixel in the order of the samples, whose number is then the channel. A chunky page
/// is read and decoded once for each of its samples, so that frames stay independent of each other.
/// </summary>
internal sealed class TiffReader : IStackReader
{
    private readonly ConcurrentBag<SegmentTable> tables = [];
    private readonly (int Page, int Sample)[] frames;

    private TiffReader(TiffFormat format, TiffFile file, PageIndex index)
    {
        Format = format;
        File = file;
        Index = index;
        Metadata = new TiffMetadata(file, index);
        frames = Frames(index);
        if (frames.Length == 0)
            throw new StackFormatException(file.Path, "the file holds thumbnails only", "name the file they were made from");
    }

    /// <inheritdoc/>
    public string Path => File.Path;

    /// <inheritdoc/>
    public IStackFormat Format { get; }

    /// <inheritdoc/>
    public int FrameCount => frames.Length;

    /// <inheritdoc/>
    public IReadOnlyList<string> Losses => Index.Losses;

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

    /// <summary>What TIFF says of a frame's noise.</summary>
    internal static HeaderNoise NoNoise { get; } = new(null, null, null, "TIFF has no fields for gain, read noise or pedestal", null);

    /// <summary>Opens a file, and with it the other files of its OME set where its OME-XML names some.</summary>
    public static IStackReader Open(TiffFormat format, string path, ReadOptions options)
    {
        TiffReader reader = OpenAlone(format, path, options);
        try
        {
            if (OmeSet.Of(reader, options) is not { } set)
                return reader;
            reader.Dispose();
            return new OmeSetReader(format, set, options);
        }
        catch
        {
            reader.Dispose();
            throw;
        }
    }

    /// <summary>Opens a file and walks over its pages.</summary>
    public static TiffReader OpenAlone(TiffFormat format, string path, ReadOptions options)
    {
        TiffFile file = TiffFile.Open(path, options.AllowTruncated);
        try
        {
            if (options.Extensions is { Count: > 0 } names)
                throw new StackFormatException(path, $"the recipe names the extension {names[0]}, a TIFF file has none", "leave extensions out of the recipe's [input]");
            return new TiffReader(format, file, PageIndex.Walk(file));
        }
        catch
        {
            file.Dispose();
            throw;
        }
    }

    /// <inheritdoc/>
    public FrameLayout Layout(int frame) => Metadata.Layout(PageOf(frame).Layout, frames[frame].Page, frames[frame].Sample);

    /// <inheritdoc/>
    public HeaderNoise NoiseOf(int frame) => NoNoise;

    /// <inheritdoc/>
    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation) => TiffHealth.Check(this, cancellation);

    /// <inheritdoc/>
    public void Read(int frame, ByteBuffer raw)
    {
        if (!tables.TryTake(out SegmentTable? table))
            table = new SegmentTable(File);
        (int first, int segments) = SegmentsOf(frame);
        table.Load(PageOf(frame));
        int header = 4 * segments;
        long total = header;
        for (int i = 0; i < segments; i++)
            total += table[first + i].Count;
        Span<byte> bytes = raw.Resize(checked((int)total));
        Span<int> counts = MemoryMarshal.Cast<byte, int>(bytes[..header]);
        Span<byte> data = bytes[header..];
        for (int i = 0, done = 0; i < segments;)
        {
            // Segments that follow each other in the file are read at once.
            (long start, _) = table[first + i];
            int length = 0;
            for (; i < segments && table[first + i].Offset == start + length; i++)
            {
                counts[i] = (int)table[first + i].Count;
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
        (int first, int segments) = SegmentsOf(frame);
        int at = 4 * segments;
        ReadOnlySpan<int> counts = MemoryMarshal.Cast<byte, int>(raw[..at]);
        for (int i = 0; i < counts.Length; i++)
        {
            string? problem = SegmentCodec.Decode(layout, File.BigEndian, first + i, frames[frame].Sample, raw.Slice(at, counts[i]), stored);
            if (problem is not null)
                throw new StackFormatException(WhereIs(frame, first + i), problem, "copy the file again from its source");
            at += counts[i];
        }
    }

    /// <inheritdoc/>
    public long RawBytes(int frame)
    {
        // Of a chunky page all samples of a pixel are read for each of them. Before the segments stand their lengths.
        SegmentGrid grid = PageOf(frame).Layout.Grid;
        long together = grid.Planes == 1 ? PageOf(frame).Layout.Samples : 1;
        return (together * Layout(frame).StoredBytes) + (sizeof(int) * grid.PlaneCount);
    }

    /// <inheritdoc/>
    public bool MarkQuality(int frame, Plane<SampleFlags> flags) => false;

    /// <inheritdoc/>
    public void Dispose() => File.Dispose();

    /// <summary>A frame's layout by its page alone, without a place in an OME image.</summary>
    internal FrameLayout OwnLayout(int frame) => PageOf(frame).Layout.FrameOf(frames[frame].Sample);

    /// <summary>The first frame of a page; negative where it holds none.</summary>
    internal int FrameOfPage(int page) => Array.BinarySearch(frames, (page, 0));

    /// <summary>Number of the page a frame stands in.</summary>
    internal int PageNumber(int frame) => frames[frame].Page;

    /// <summary>True when the frame's image data are compressed.</summary>
    internal bool IsCompressed(int frame) => PageOf(frame).Layout.Compression != Compression.None;

    private static (int Page, int Sample)[] Frames(PageIndex index)
    {
        (int Page, int Sample)[] frames = new (int, int)[index.Pages.Sum(p => p.Layout.Samples)];
        for (int p = 0, f = 0; p < index.Pages.Count; p++)
        {
            for (int s = 0; s < index.Pages[p].Layout.Samples; s++)
                frames[f++] = (p, s);
        }

        return frames;
    }

    private Page PageOf(int frame) => Index.Pages[frames[frame].Page];

    private (int First, int Count) SegmentsOf(int frame)
    {
        SegmentGrid grid = PageOf(frame).Layout.Grid;
        return ((int)grid.First(frames[frame].Sample), (int)grid.PlaneCount);
    }

    private string WhereIs(int frame, int segment)
    {
        SegmentTable table = new(File);
        table.Load(PageOf(frame));
        return string.Create(CultureInfo.InvariantCulture, $"{Path}, page {frames[frame].Page}, {PageOf(frame).Layout.Grid.Word} {segment}, byte {table[segment].Offset}");
    }
}
