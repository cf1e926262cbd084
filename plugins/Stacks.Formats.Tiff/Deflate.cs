using System.Globalization;
using System.IO.Compression;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>Deflate in the zlib format (RFC 1950, RFC 1951), as compression schemes 8 and 32946 use it.</summary>
internal static class Deflate
{
    /// <summary>
    /// Measured on differences of 16-bit and float noise: level 1 loses a third of what there is to gain, level 2 a twentieth,
    /// and runs twice as fast as those above.
    /// </summary>
    private static readonly ZLibCompressionOptions Options = new() { CompressionLevel = 2 };

    /// <summary>
    /// Decodes to the end of the data, whose own checksum is then checked. The stream object of the base library cannot be
    /// used twice: one is made for each segment.
    /// </summary>
    /// <param name="source">Compressed bytes.</param>
    /// <param name="output">Receives the bytes.</param>
    /// <param name="longest">Bytes the data may hold: some writers fill the last strip with rows below the page.</param>
    /// <returns>Null, or what is wrong with the data.</returns>
    public static unsafe string? Decode(ReadOnlySpan<byte> source, Span<byte> output, int longest)
    {
        if (source.IsEmpty)
            return "the Deflate data are empty";
        fixed (byte* start = source)
        {
            using UnmanagedMemoryStream stream = new(start, source.Length);
            using ZLibStream inflater = new(stream, CompressionMode.Decompress);
            try
            {
                int done = inflater.ReadAtLeast(output, output.Length, throwOnEndOfStream: false);
                if (done < output.Length)
                    return string.Create(CultureInfo.InvariantCulture, $"the Deflate data end after {done} of {output.Length} bytes");
                Span<byte> below = stackalloc byte[1024];
                for (int got = -1; got != 0 && done <= longest; done += got)
                    got = inflater.Read(below);
                return done <= longest ? null : "the Deflate data are longer than the page";
            }
            catch (Exception error) when (error is InvalidDataException or IOException or ArgumentOutOfRangeException)
            {
                // The base library throws the second where the data ask for a preset dictionary, and the third where damaged data
                // end in the middle of its look-ahead.
                return "the Deflate data are damaged";
            }
        }
    }

    /// <summary>Appends the compressed form of some bytes.</summary>
    public static void Encode(ReadOnlySpan<byte> source, ByteBuffer output)
    {
        using BufferStream stream = new(output);
        using ZLibStream deflater = new(stream, Options, leaveOpen: true);
        deflater.Write(source);
    }

    /// <summary>A stream that appends to a buffer.</summary>
    private sealed class BufferStream(ByteBuffer buffer) : Stream
    {
        public override bool CanRead => false;

        public override bool CanSeek => false;

        public override bool CanWrite => true;

        public override long Length => buffer.Length;

        public override long Position { get => buffer.Length; set => throw new NotSupportedException(); }

        public override void Write(byte[] bytes, int offset, int count) => buffer.Append(bytes.AsSpan(offset, count));

        public override void Write(ReadOnlySpan<byte> bytes) => buffer.Append(bytes);

        public override void Flush()
        {
        }

        public override int Read(byte[] bytes, int offset, int count) => throw new NotSupportedException();

        public override long Seek(long offset, SeekOrigin origin) => throw new NotSupportedException();

        public override void SetLength(long value) => throw new NotSupportedException();
    }
}
