namespace Stacks.Formats.Fits;

/// <summary>Writes a data unit piece by piece and keeps its DATASUM.</summary>
/// <param name="file">The output.</param>
/// <param name="offset">Where the data unit starts.</param>
internal sealed class DataUnit(PartialFile file, long offset)
{
    private const int StripBytes = 1 << 17;
    private static readonly byte[] Zeros = new byte[FitsBlock.Bytes];
    private long length;

    /// <summary>The sum of all that was written.</summary>
    public uint Sum { get; private set; }

    /// <summary>Writes the next piece, a strip after the other that is summed while it is in cache.</summary>
    public void Append(ReadOnlySpan<byte> bytes)
    {
        for (; bytes.Length > 0; bytes = bytes[Math.Min(bytes.Length, StripBytes)..])
        {
            ReadOnlySpan<byte> strip = bytes[..Math.Min(bytes.Length, StripBytes)];
            Sum = FitsChecksum.AddPart(Sum, FitsChecksum.Sum(strip), length);
            file.Write(strip, offset + length);
            length += strip.Length;
        }
    }

    /// <summary>Fills the last block with zeros and returns the offset behind it.</summary>
    public long Pad()
    {
        long padded = FitsBlock.Padded(length);
        file.Write(Zeros.AsSpan(0, (int)(padded - length)), offset + length);
        return offset + padded;
    }
}
