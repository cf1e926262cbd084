using System.Buffers;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>Compresses the tiles of a frame: the length of each tile, then their bytes one behind the other.</summary>
internal static class TileEncoder
{
    /// <summary>Compresses a frame.</summary>
    /// <param name="plan">How it is cut and compressed.</param>
    /// <param name="stored">Stored samples, little-endian; overwritten.</param>
    /// <param name="encoded">Receives lengths, 32 bits each, and tiles.</param>
    public static void Encode(TilePlan plan, Span<byte> stored, ByteBuffer encoded)
    {
        int size = plan.Type.Size();
        int count = (int)plan.Grid.TilesOfPlane;
        encoded.Resize(count * sizeof(int));
        if (plan.IsRice)
            SampleEncoding.FlipSigns(plan.Type, stored);
        else
            SampleEncoding.Encode(plan.Type, stored, stored);
        int most = (int)plan.Grid.TileSamples * size;
        byte[] rented = ArrayPool<byte>.Shared.Rent(plan.IsRice ? RiceBytes(most, size) : most);
        try
        {
            for (int n = 0, at = 0; n < count; n++)
            {
                Span<byte> samples = stored.Slice(at, plan.Grid.PartOf(0, n).Samples * size);
                at += samples.Length;
                int before = encoded.Length;
                if (plan.IsRice)
                {
                    encoded.Append(rented.AsSpan(0, EncodeRice(samples, size, rented)));
                }
                else
                {
                    GzipTile.Shuffle(samples, size, rented);
                    GzipTile.Encode(rented.AsSpan(0, samples.Length), encoded);
                }

                MemoryMarshal.Cast<byte, int>(encoded.Written[..(count * sizeof(int))])[n] = encoded.Length - before;
            }
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(rented);
        }
    }

    private static int RiceBytes(int bytes, int size) => size switch
    {
        1 => RiceCode.MostBytes<byte>(bytes, TilePlan.BlockSize),
        2 => RiceCode.MostBytes<short>(bytes / size, TilePlan.BlockSize),
        _ => RiceCode.MostBytes<int>(bytes / size, TilePlan.BlockSize),
    };

    private static int EncodeRice(ReadOnlySpan<byte> samples, int size, Span<byte> stream) => size switch
    {
        1 => RiceCode.Encode(samples, TilePlan.BlockSize, stream),
        2 => RiceCode.Encode(MemoryMarshal.Cast<byte, short>(samples), TilePlan.BlockSize, stream),
        _ => RiceCode.Encode(MemoryMarshal.Cast<byte, int>(samples), TilePlan.BlockSize, stream),
    };
}
