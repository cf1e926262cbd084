using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// A TIFF file in the making: image data first, as they come, then all directories from the places noted here, then
/// the place of the first directory in the header.
/// </summary>
internal sealed class PageFile : IDisposable
{
    private readonly OutputFileStream output;
    private readonly DirectoryWriter writer;
    private readonly bool bigEndian;
    private readonly Compression compression;
    private readonly List<(long Offset, int[]? Counts)> placed = [];
    private long firstDirectory;

    /// <summary>Creates the file.</summary>
    /// <param name="path">Path.</param>
    /// <param name="bigEndian">Byte order.</param>
    /// <param name="isBig">BigTIFF.</param>
    /// <param name="compression">Compression of science pages: none, Deflate or Zstandard.</param>
    public PageFile(string path, bool bigEndian, bool isBig, Compression compression)
    {
        this.bigEndian = bigEndian;
        this.compression = compression;
        output = new OutputFileStream(path);
        writer = new DirectoryWriter(output, bigEndian, isBig);
        writer.WriteHeader();
    }

    /// <summary>Frames placed so far.</summary>
    public int Frames => placed.Count;

    /// <summary>Makes the bytes of a frame. Safe for concurrent use.</summary>
    public void Encode(FrameLayout frame, SampleType type, Span<byte> stored, ByteBuffer bytes) =>
        SegmentCodec.Encode(Strips(frame, type), compression, PredictorFor(type), bigEndian, stored, bytes);

    /// <summary>Appends the image data of the next frame.</summary>
    public void Append(FrameLayout frame, SampleType type, ReadOnlySpan<byte> bytes)
    {
        int[]? counts = null;
        if (compression != Compression.None)
        {
            int table = 4 * (int)Strips(frame, type).Count;
            counts = MemoryMarshal.Cast<byte, int>(bytes[^table..]).ToArray();
            bytes = bytes[..^table];
        }

        output.Align();
        placed.Add((output.Position, counts));
        output.Append(bytes);
    }

    /// <summary>Copies image data that are carried as they stand and gives the fields that point to them.</summary>
    public IEnumerable<OutputField> Copy(TiffFile source, SegmentTable table, bool tiled)
    {
        byte[] buffer = new byte[65536];
        long[] offsets = new long[table.Length];
        long[] counts = new long[table.Length];
        for (int i = 0; i < table.Length; i++)
        {
            (long at, counts[i]) = table[i];
            output.Align();
            offsets[i] = output.Position;
            for (long done = 0; done < counts[i];)
            {
                Span<byte> part = buffer.AsSpan(0, (int)Math.Min(buffer.Length, counts[i] - done));
                source.Read(at + done, part);
                output.Append(part);
                done += part.Length;
            }
        }

        return [writer.Offsets(tiled ? Tag.TileOffsets : Tag.StripOffsets, offsets), writer.Long(tiled ? Tag.TileByteCounts : Tag.StripByteCounts, counts)];
    }

    /// <summary>The fields that say how a page is stored.</summary>
    /// <param name="frame">The page's first frame.</param>
    /// <param name="layout">Its layout.</param>
    /// <param name="type">Sample type of all its frames.</param>
    /// <param name="samples">Samples of a pixel: frames that follow each other as the planes of the page.</param>
    public IEnumerable<OutputField> ImageFields(int frame, FrameLayout layout, SampleType type, int samples = 1)
    {
        SegmentGrid grid = Strips(layout, type);
        int strips = (int)grid.Count;
        long[] offsets = new long[samples * strips];
        long[] counts = new long[samples * strips];
        for (int s = 0; s < samples; s++)
        {
            (long at, int[]? lengths) = placed[frame + s];
            for (int i = 0; i < strips; i++)
            {
                offsets[(s * strips) + i] = at;
                counts[(s * strips) + i] = lengths?[i] ?? grid.BytesOf(i);
                at += counts[(s * strips) + i];
            }
        }

        yield return writer.Long(Tag.ImageWidth, layout.Width);
        yield return writer.Long(Tag.ImageLength, layout.Height);
        yield return writer.Short(Tag.BitsPerSample, 8 * type.Size(), samples);
        yield return writer.Short(Tag.Compression, (int)compression);
        yield return writer.Offsets(Tag.StripOffsets, offsets);
        yield return writer.Short(Tag.SamplesPerPixel, samples);
        yield return writer.Long(Tag.RowsPerStrip, grid.SegmentHeight);
        yield return writer.Long(Tag.StripByteCounts, counts);
        yield return writer.Short(Tag.PlanarConfiguration, samples == 1 ? 1 : 2);
        yield return writer.Short(Tag.SampleFormat, SampleFormatOf(type), samples);
        if (compression != Compression.None)
            yield return writer.Short(Tag.Predictor, PredictorFor(type));
    }

    /// <summary>PhotometricInterpretation 1: 0 is black.</summary>
    public OutputField BlackIsZero => writer.Short(Tag.Photometric, 1);

    /// <summary>Writes the next directory; no image data may follow.</summary>
    /// <param name="fields">Its fields, in any order; of two with one tag the first is written.</param>
    /// <param name="last">True for the last.</param>
    public void WriteDirectory(IEnumerable<OutputField> fields, bool last)
    {
        output.Align();
        if (firstDirectory == 0)
            firstDirectory = output.Position;
        writer.Write([.. fields.DistinctBy(f => f.Tag).OrderBy(f => f.Tag)], last);
    }

    /// <summary>Patches the header. The file is then complete.</summary>
    public void Finish()
    {
        output.Flush();
        writer.PatchFirst(firstDirectory);
    }

    /// <inheritdoc/>
    public void Dispose() => output.Dispose();

    private static SegmentGrid Strips(FrameLayout frame, SampleType type) => SegmentGrid.Strips(frame.Width, frame.Height, type.Size());

    private static int PredictorFor(SampleType type) => type.IsInteger() ? 2 : 3;

    private static int SampleFormatOf(SampleType type) => type switch
    {
        SampleType.Float16 or SampleType.Float32 or SampleType.Float64 => 3,
        SampleType.Int8 or SampleType.Int16 or SampleType.Int32 or SampleType.Int64 => 2,
        _ => 1,
    };
}
