using System.Buffers;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>Decodes the tiles of a plane into stored samples.</summary>
internal static class TileDecoder
{
    /// <summary>Decodes what <see cref="TileRows.Read"/> gave.</summary>
    /// <param name="hdu">A compressed image.</param>
    /// <param name="plane">The plane.</param>
    /// <param name="raw">Entries and tiles.</param>
    /// <param name="stored">Receives the plane's stored samples, little-endian, row-major.</param>
    /// <exception cref="StackFormatException">A tile is not what the table promises.</exception>
    public static void Decode(Hdu hdu, long plane, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        TiledImage image = hdu.Tiles!;
        int size = hdu.Layout!.SampleType.Size();
        int rowBytes = hdu.Layout.Width * size;
        long first = image.Grid.FirstTileOf(plane);
        ReadOnlySpan<TileEntry> entries = TileRows.Entries(hdu, raw);
        for (int n = 0; n < entries.Length; n++)
        {
            TilePart part = image.Grid.PartOf(plane, n);
            ReadOnlySpan<byte> bytes = raw.Slice((int)entries[n].Offset, entries[n].Length);
            Span<byte> place = stored[((part.Y * rowBytes) + (part.X * size))..];
            if (part.IsWhole && part.Width == hdu.Layout.Width)
            {
                DecodeTile(hdu, first + n, entries[n], bytes, part, place[..(part.Samples * size)]);
                continue;
            }

            byte[] tile = ArrayPool<byte>.Shared.Rent(part.TileSamples * size);
            try
            {
                DecodeTile(hdu, first + n, entries[n], bytes, part, tile.AsSpan(0, part.TileSamples * size));
                for (int y = 0; y < part.Height; y++)
                    tile.AsSpan((part.FirstSample + (y * part.Width)) * size, part.Width * size).CopyTo(place[(y * rowBytes)..]);
            }
            finally
            {
                ArrayPool<byte>.Shared.Return(tile);
            }
        }
    }

    private static void DecodeTile(Hdu hdu, long tile, TileEntry entry, ReadOnlySpan<byte> bytes, TilePart part, Span<byte> stored)
    {
        if (TileSamples.Decode(hdu.Tiles!, hdu.Layout!.SampleType, tile, entry, bytes, part, stored) is { } problem)
            throw new StackFormatException(TileRows.Place(hdu, tile), $"the tile is broken: {problem}", "get the file again");
    }
}
