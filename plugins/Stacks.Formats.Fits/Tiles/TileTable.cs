using System.Buffers.Binary;
using System.Runtime.InteropServices;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// Writes a table of tiles frame by frame: descriptors at their rows, whose place is known from the start, and tiles one
/// behind the other in the heap behind them.
/// </summary>
/// <param name="file">The output.</param>
/// <param name="offset">Where the data unit starts.</param>
/// <param name="plan">How the image is cut.</param>
internal sealed class TileTable(PartialFile file, long offset, TilePlan plan)
{
    private static readonly byte[] Zeros = new byte[FitsBlock.Bytes];
    private readonly byte[] descriptors = new byte[plan.Grid.TilesOfPlane * plan.DescriptorBytes];
    private long rows;
    private uint sum;

    /// <summary>Bytes of all tiles.</summary>
    public long HeapBytes { get; private set; }

    /// <summary>Bytes of the longest tile.</summary>
    public int Longest { get; private set; }

    /// <summary>Bytes of the data unit, without padding.</summary>
    public long Bytes => plan.TableBytes + HeapBytes;

    /// <summary>Writes the tiles of the next frame, as <see cref="TileEncoder"/> gave them.</summary>
    public void Append(ReadOnlySpan<byte> encoded)
    {
        int count = (int)plan.Grid.TilesOfPlane;
        ReadOnlySpan<int> lengths = MemoryMarshal.Cast<byte, int>(encoded[..(count * sizeof(int))]);
        ReadOnlySpan<byte> tiles = encoded[(count * sizeof(int))..];
        long at = HeapBytes;
        for (int i = 0; i < count; i++)
        {
            Span<byte> descriptor = descriptors.AsSpan(i * plan.DescriptorBytes, plan.DescriptorBytes);
            if (plan.DescriptorType == 'Q')
            {
                BinaryPrimitives.WriteInt64BigEndian(descriptor, lengths[i]);
                BinaryPrimitives.WriteInt64BigEndian(descriptor[8..], at);
            }
            else
            {
                BinaryPrimitives.WriteInt32BigEndian(descriptor, lengths[i]);
                BinaryPrimitives.WriteInt32BigEndian(descriptor[4..], checked((int)at));
            }

            at += lengths[i];
            Longest = Math.Max(Longest, lengths[i]);
        }

        Write(descriptors, rows * plan.DescriptorBytes);
        Write(tiles, Bytes);
        rows += count;
        HeapBytes += tiles.Length;
    }

    /// <summary>Fills the last block with zeros and returns the sum of the data unit.</summary>
    public uint Finish()
    {
        file.Write(Zeros.AsSpan(0, (int)(FitsBlock.Padded(Bytes) - Bytes)), offset + Bytes);
        return sum;
    }

    private void Write(ReadOnlySpan<byte> bytes, long at)
    {
        file.Write(bytes, offset + at);
        sum = FitsChecksum.AddPart(sum, FitsChecksum.Sum(bytes), at);
    }
}
