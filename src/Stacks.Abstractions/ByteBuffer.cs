namespace Stacks.Abstractions;

/// <summary>A growing byte buffer that is reused from frame to frame.</summary>
public sealed class ByteBuffer
{
    private byte[] bytes = [];

    /// <summary>Bytes in use.</summary>
    public int Length { get; private set; }

    /// <summary>The bytes in use.</summary>
    public Span<byte> Written => bytes.AsSpan(0, Length);

    /// <summary>The bytes in use, as memory.</summary>
    public Memory<byte> WrittenMemory => bytes.AsMemory(0, Length);

    /// <summary>Sets the length and returns that many bytes, whose content is undefined.</summary>
    public Span<byte> Resize(int length)
    {
        if (bytes.Length < length)
            bytes = GC.AllocateUninitializedArray<byte>(length);
        Length = length;
        return bytes.AsSpan(0, length);
    }

    /// <summary>Appends bytes; the existing content stays.</summary>
    public void Append(ReadOnlySpan<byte> more)
    {
        int needed = checked(Length + more.Length);
        if (bytes.Length < needed)
            Array.Resize(ref bytes, Math.Max(needed, (int)Math.Min(Array.MaxLength, 2L * bytes.Length)));
        more.CopyTo(bytes.AsSpan(Length));
        Length = needed;
    }
}
