using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Lets a compressor append to a <see cref="ByteBuffer"/>.</summary>
/// <param name="buffer">The buffer.</param>
internal sealed class ByteBufferStream(ByteBuffer buffer) : Stream
{
    /// <inheritdoc/>
    public override bool CanRead => false;

    /// <inheritdoc/>
    public override bool CanSeek => false;

    /// <inheritdoc/>
    public override bool CanWrite => true;

    /// <inheritdoc/>
    public override long Length => buffer.Length;

    /// <inheritdoc/>
    public override long Position
    {
        get => buffer.Length;
        set => throw new NotSupportedException();
    }

    /// <inheritdoc/>
    public override void Write(ReadOnlySpan<byte> bytes) => buffer.Append(bytes);

    /// <inheritdoc/>
    public override void Write(byte[] bytes, int offset, int count) => Write(bytes.AsSpan(offset, count));

    /// <inheritdoc/>
    public override void Flush()
    {
    }

    /// <inheritdoc/>
    public override int Read(byte[] bytes, int offset, int count) => throw new NotSupportedException();

    /// <inheritdoc/>
    public override long Seek(long offset, SeekOrigin origin) => throw new NotSupportedException();

    /// <inheritdoc/>
    public override void SetLength(long value) => throw new NotSupportedException();
}
