namespace Stacks.Formats.Fits;

/// <summary>Writes a data unit piece by piece and keeps its DATASUM.</summary>
/// <param name="file">The output.</param>
/// <param name="offset">Where the data unit starts.</param>
internal sealed class DataUnit(PartialFile file, long offset)
{
    private static readonly byte[] Zeros = new byte[FitsBlock.Bytes];
    private long length;

    /// <summary>The sum of all that was written.</summary>
    public uint Sum { get; private set; }

    /// <summary>Writes the next piece.</summary>
    public void Append(ReadOnlySpan<byte> bytes)
    {
        file.Write(bytes, offset + length);
        Sum = FitsChecksum.AddPart(Sum, FitsChecksum.Sum(bytes), length);
        length += bytes.Length;
    }

    /// <summary>Fills the last block with zeros and returns the offset behind it.</summary>
    public long Pad()
    {
        long padded = FitsBlock.Padded(length);
        file.Write(Zeros.AsSpan(0, (int)(padded - length)), offset + length);
        return offset + padded;
    }
}
