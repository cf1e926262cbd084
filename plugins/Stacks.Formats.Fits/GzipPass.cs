using System.IO.Compression;

namespace Stacks.Formats.Fits;

/// <summary>
/// One pass over what a gzipped file holds (RFC 1952, one member or several). The base library takes a stream that is cut
/// for one that ends, so a member of our own follows the file's: only a stream that ends as it should is followed by it.
/// </summary>
internal sealed class GzipPass : IDisposable
{
    private const int PieceBytes = 1 << 16;
    private static readonly byte[] Mark = "stacks: the end."u8.ToArray();
    private static readonly byte[] MarkMember = Gzip(Mark);

    private readonly string path;
    private readonly byte[] piece = new byte[PieceBytes];
    private GZipStream inflater;
    private int start;
    private int end;
    private bool isAtEnd;

    /// <summary>Opens a file.</summary>
    public GzipPass(string path)
    {
        this.path = path;
        inflater = Open();
    }

    /// <summary>Offset of the next byte.</summary>
    public long Position { get; private set; }

    /// <summary>Where what the file holds ends, once that is known and the stream should not end there; else null.</summary>
    public long? DamagedAt { get; private set; }

    /// <summary>The next bytes; fewer than asked for, and in the end none, where there are no more.</summary>
    public int Read(Span<byte> buffer)
    {
        int done = 0;
        while (done < buffer.Length && Ready() is > 0 and int ready)
        {
            int count = Math.Min(ready, buffer.Length - done);
            piece.AsSpan(start, count).CopyTo(buffer[done..]);
            Take(count);
            done += count;
        }

        return done;
    }

    /// <summary>Goes on to an offset, or to the end.</summary>
    public void SkipTo(long offset)
    {
        while (Position < offset && Ready() is > 0 and int ready)
            Take((int)Math.Min(ready, offset - Position));
    }

    /// <inheritdoc/>
    public void Dispose() => inflater.Dispose();

    private void Take(int count)
    {
        start += count;
        Position += count;
    }

    /// <summary>Bytes of the piece that may be taken: all but as many as our mark has, which may be the mark.</summary>
    private int Ready()
    {
        while (!isAtEnd && end - start <= Mark.Length)
        {
            piece.AsSpan(start, end - start).CopyTo(piece);
            end -= start;
            start = 0;
            int got = TryInflate(piece.AsSpan(end));
            if (got < 0)
                got = InflateSingly(piece.AsSpan(end));
            end += got;
            if (got > 0)
                continue;
            isAtEnd = true;
            if (piece.AsSpan(start, end - start).EndsWith(Mark))
                end -= Mark.Length;
            else
                DamagedAt = Position + end - start;
        }

        return isAtEnd ? end - start : end - start - Mark.Length;
    }

    /// <summary>
    /// A stream that meets damage gives none of the bytes before it in the same read: out of a new one they come one by one,
    /// so that the end does not depend on how much was asked for.
    /// </summary>
    private int InflateSingly(Span<byte> buffer)
    {
        long before = Position + end - start;
        inflater.Dispose();
        inflater = Open();
        while (before > 0 && TryInflate(buffer[..(int)Math.Min(before, buffer.Length)]) is > 0 and int skipped)
            before -= skipped;
        int done = 0;
        while (before == 0 && done < buffer.Length && TryInflate(buffer.Slice(done, 1)) > 0)
            done++;
        return done;
    }

    /// <summary>Bytes inflated; -1 where the stream is damaged.</summary>
    private int TryInflate(Span<byte> buffer)
    {
        try
        {
            return inflater.Read(buffer);
        }
        catch (Exception error) when (error is InvalidDataException or ArgumentOutOfRangeException)
        {
            // The base library throws the second where damaged data end in the middle of its look-ahead.
            return -1;
        }
    }

    private GZipStream Open() => new(
        new Followed(new FileStream(path, FileMode.Open, FileAccess.Read, FileShare.Read, PieceBytes, FileOptions.SequentialScan)), CompressionMode.Decompress);

    private static byte[] Gzip(byte[] bytes)
    {
        MemoryStream stream = new();
        using (GZipStream gzip = new(stream, CompressionLevel.Fastest))
            gzip.Write(bytes);
        return stream.ToArray();
    }

    /// <summary>A file's bytes, and then those of our member.</summary>
    private sealed class Followed(FileStream file) : Stream
    {
        private int given;

        public override bool CanRead => true;

        public override bool CanSeek => false;

        public override bool CanWrite => false;

        public override long Length => throw new NotSupportedException();

        public override long Position
        {
            get => throw new NotSupportedException();
            set => throw new NotSupportedException();
        }

        public override int Read(Span<byte> buffer)
        {
            int got = file.Read(buffer);
            if (got > 0)
                return got;
            int count = Math.Min(buffer.Length, MarkMember.Length - given);
            MarkMember.AsSpan(given, count).CopyTo(buffer);
            given += count;
            return count;
        }

        public override int Read(byte[] buffer, int offset, int count) => Read(buffer.AsSpan(offset, count));

        public override void Flush()
        {
        }

        public override long Seek(long offset, SeekOrigin origin) => throw new NotSupportedException();

        public override void SetLength(long value) => throw new NotSupportedException();

        public override void Write(byte[] buffer, int offset, int count) => throw new NotSupportedException();

        protected override void Dispose(bool disposing)
        {
            file.Dispose();
            base.Dispose(disposing);
        }
    }
}
