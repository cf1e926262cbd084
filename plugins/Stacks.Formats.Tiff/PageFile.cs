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
    private readonly bool compress;
    private readonly List<(long Offset, int[]? Counts)> placed = [];
    private long firstDirectory;

    /// <summary>Creates the file.</summary>
    /// <param name="path">Path.</param>
    /// <param name="bigEndian">Byte order.</param>
    /// <param name="isBig">BigTIFF.</param>
    /// <param name="compress">Deflate for science pages.</param>
    public PageFile(string path, bool bigEndian, bool isBig, bool compress)
    {
        this.bigEndian = bigEndian;
        this.compress = compress;
        output = new OutputFileStream(path);
        writer = new DirectoryWriter(output, bigEndian, isBig);
        writer.WriteHeader();
    }

    /// <summary>Frames placed so far.</summary>
    public int Frames => placed.Count;

    /// <summary>Makes the bytes of a frame. Safe for concurrent use.</summary>
    public void Encode(FrameLayout frame, SampleType type, Span<byte> stored, ByteBuffer bytes) =>
        SegmentCodec.Encode(Strips(frame, type), compress ? PredictorFor(type) : 0, bigEndian, stored, bytes);

    /// <summary>Appends the image data of the next frame.</summary>
    public void Append(FrameLayout frame, SampleType type, ReadOnlySpan<byte> bytes)
    {
        int[]? counts = null;
        if (compress)
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

    /// <summary>The fields that say how a frame is stored.</summary>
    public IEnumerable<OutputField> ImageFields(int frame, FrameLayout layout, SampleType type)
    {
        SegmentGrid grid = Strips(layout, type);
        (long at, int[]? lengths) = placed[frame];
        long[] offsets = new long[grid.Count];
        long[] counts = new long[grid.Count];
        for (int i = 0; i < offsets.Length; i++)
        {
            offsets[i] = at;
            counts[i] = lengths?[i] ?? grid.BytesOf(i);
            at += counts[i];
        }

        yield return writer.Long(Tag.ImageWidth, layout.Width);
        yield return writer.Long(Tag.ImageLength, layout.Height);
        yield return writer.Short(Tag.BitsPerSample, 8 * type.Size());
        yield return writer.Short(Tag.Compression, compress ? (int)Compression.Deflate : (int)Compression.None);
        yield return writer.Offsets(Tag.StripOffsets, offsets);
        yield return writer.Short(Tag.SamplesPerPixel, 1);
        yield return writer.Long(Tag.RowsPerStrip, grid.SegmentHeight);
        yield return writer.Long(Tag.StripByteCounts, counts);
        yield return writer.Short(Tag.PlanarConfiguration, 1);
        yield return writer.Short(Tag.SampleFormat, SampleFormatOf(type));
        if (compress && PredictorFor(type) != 1)
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
