using System.Buffers.Binary;
using System.IO.Compression;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// Tiles compressed with gzip (RFC 1952; FITS Standard 4.0, section 10.4.2): GZIP_1 takes the big-endian bytes as they are,
/// GZIP_2 all first bytes of the samples before all second ones, and so on.
/// </summary>
internal static class GzipTile
{
    /// <summary>Inflates a tile; never more than there is room for.</summary>
    /// <param name="stream">The tile's bytes.</param>
    /// <param name="bytes">Receives the bytes of the samples.</param>
    /// <returns>What is wrong with the stream; null when nothing is.</returns>
    public static unsafe string? Decode(ReadOnlySpan<byte> stream, Span<byte> bytes)
    {
        if (stream.IsEmpty)
            return "it is empty";
        fixed (byte* start = stream)
        {
            using UnmanagedMemoryStream memory = new(start, stream.Length);
            using GZipStream gzip = new(memory, CompressionMode.Decompress);
            try
            {
                int got = gzip.ReadAtLeast(bytes, bytes.Length, throwOnEndOfStream: false);
                if (got < bytes.Length)
                    return $"it holds {got} bytes, not {bytes.Length}";
                Span<byte> more = stackalloc byte[1];
                if (gzip.Read(more) > 0)
                    return $"it holds more than {bytes.Length} bytes";

                // The base library does not mind a stream that is cut behind its last byte, before its checksum.
                return BinaryPrimitives.ReadUInt32LittleEndian(stream[^sizeof(uint)..]) == (uint)bytes.Length ? null : "it is no whole gzip stream";
            }
            catch (Exception error) when (error is InvalidDataException or ArgumentOutOfRangeException)
            {
                // The base library throws the second where damaged data end in the middle of its look-ahead.
                return "it is no whole gzip stream";
            }
        }
    }

    /// <summary>Deflates bytes and appends them.</summary>
    public static void Encode(ReadOnlySpan<byte> bytes, ByteBuffer stream)
    {
        using GZipStream gzip = new(new ByteBufferStream(stream), CompressionLevel.Fastest);
        gzip.Write(bytes);
    }

    /// <summary>Sample by sample to first bytes first: shuffled[b * n + i] = bytes[i * size + b].</summary>
    public static void Shuffle(ReadOnlySpan<byte> bytes, int size, Span<byte> shuffled)
    {
        int count = bytes.Length / size;
        for (int b = 0; b < size; b++)
        {
            Span<byte> plane = shuffled.Slice(b * count, count);
            for (int i = 0; i < plane.Length; i++)
                plane[i] = bytes[(i * size) + b];
        }
    }

    /// <summary>The inverse of <see cref="Shuffle"/>.</summary>
    public static void Unshuffle(ReadOnlySpan<byte> shuffled, int size, Span<byte> bytes)
    {
        int count = bytes.Length / size;
        for (int b = 0; b < size; b++)
        {
            ReadOnlySpan<byte> plane = shuffled.Slice(b * count, count);
            for (int i = 0; i < plane.Length; i++)
                bytes[(i * size) + b] = plane[i];
        }
    }
}
