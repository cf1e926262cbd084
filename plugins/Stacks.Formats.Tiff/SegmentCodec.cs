using System.Buffers;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>Turns the segments of a page into samples, and samples into strips.</summary>
internal static class SegmentCodec
{
    /// <summary>Decodes the samples that a segment holds of one plane to their place in the plane.</summary>
    /// <param name="layout">The page.</param>
    /// <param name="bigEndian">Byte order of the file.</param>
    /// <param name="segment">Number of the segment.</param>
    /// <param name="sample">Number of the plane, which is that of the sample in its pixel.</param>
    /// <param name="source">The segment's bytes.</param>
    /// <param name="stored">The plane's samples, little-endian, row-major.</param>
    /// <returns>Null, or what is wrong with the bytes.</returns>
    public static string? Decode(PageLayout layout, bool bigEndian, long segment, int sample, ReadOnlySpan<byte> source, Span<byte> stored)
    {
        SegmentGrid grid = layout.Grid;
        int length = (int)grid.BytesOf(segment);
        if (!grid.Tiled && grid.Chunk == 1)
            return Decode(layout, bigEndian, source, stored.Slice((int)(grid.Top(segment) * grid.RowBytes), length));

        byte[] rented = ArrayPool<byte>.Shared.Rent(length);
        string? problem = Decode(layout, bigEndian, source, rented.AsSpan(0, length));
        int first = grid.Planes == 1 ? sample * grid.SampleSize : 0;
        int left = grid.Left(segment);
        int top = grid.Top(segment);
        int bytes = Math.Min(grid.SegmentWidth, grid.Width - left) * grid.SampleSize;
        int rows = Math.Min(grid.SegmentHeight, grid.Height - top);
        for (int y = 0; y < rows; y++)
        {
            int at = (((top + y) * grid.Width) + left) * grid.SampleSize;
            ReadOnlySpan<byte> row = rented.AsSpan((int)(y * grid.RowBytes), (int)grid.RowBytes);
            SampleBytes.Gather(row[first..], grid.Chunk, stored.Slice(at, bytes), grid.SampleSize);
        }

        ArrayPool<byte>.Shared.Return(rented);
        return problem;
    }

    /// <summary>Appends the strips of a plane; with compression, their byte counts as 32-bit numbers after them.</summary>
    /// <param name="grid">The strips.</param>
    /// <param name="compression">None, Deflate or Zstandard.</param>
    /// <param name="predictor">Predictor; without compression there is none.</param>
    /// <param name="bigEndian">Byte order of the file.</param>
    /// <param name="stored">The plane's samples, little-endian; overwritten.</param>
    /// <param name="output">Receives the bytes.</param>
    public static void Encode(SegmentGrid grid, Compression compression, int predictor, bool bigEndian, Span<byte> stored, ByteBuffer output)
    {
        if (compression == Compression.None)
        {
            Span<byte> bytes = output.Resize(stored.Length);
            if (bigEndian)
                SampleBytes.CopyReversed(stored, bytes, grid.SampleSize);
            else
                stored.CopyTo(bytes);
            return;
        }

        output.Resize(0);
        int[] counts = ArrayPool<int>.Shared.Rent((int)grid.Count);
        for (int i = 0; i < grid.Count; i++)
        {
            Span<byte> strip = stored.Slice((int)(grid.Top(i) * grid.RowBytes), (int)grid.BytesOf(i));
            if (predictor == 2)
                HorizontalPredictor.Apply(strip, (int)grid.RowBytes, grid.SampleSize);
            if (predictor == 3)
                FloatingPointPredictor.Apply(strip, (int)grid.RowBytes, grid.SampleSize);
            else if (bigEndian)
                SampleBytes.CopyReversed(strip, strip, grid.SampleSize);
            int before = output.Length;
            if (compression == Compression.Zstd)
                Zstd.Encode(strip, output);
            else
                Deflate.Encode(strip, output);
            counts[i] = output.Length - before;
        }

        output.Append(MemoryMarshal.AsBytes(counts.AsSpan(0, (int)grid.Count)));
        ArrayPool<int>.Shared.Return(counts);
    }

    private static string? Decode(PageLayout layout, bool bigEndian, ReadOnlySpan<byte> source, Span<byte> into)
    {
        SegmentGrid grid = layout.Grid;
        int size = grid.SampleSize;
        if (layout.Compression == Compression.None)
        {
            if (bigEndian)
                SampleBytes.CopyReversed(source, into, size);
            else
                source.CopyTo(into);
            return null;
        }

        int rowBytes = (int)grid.RowBytes;
        string? problem = layout.Compression switch
        {
            Compression.Lzw => Lzw.Decode(source, into),
            Compression.PackBits => PackBits.Decode(source, into),
            Compression.Zstd => Zstd.Decode(source, into, rowBytes * grid.SegmentHeight),
            _ => Deflate.Decode(source, into, rowBytes * grid.SegmentHeight),
        };
        if (layout.Predictor == 3)
            FloatingPointPredictor.Undo(into, rowBytes, size, grid.Chunk);
        else if (bigEndian)
            SampleBytes.CopyReversed(into, into, size);
        if (layout.Predictor == 2)
            HorizontalPredictor.Undo(into, rowBytes, size, grid.Chunk);
        return problem;
    }
}
