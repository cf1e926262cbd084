using System.Buffers;
using System.Buffers.Binary;
using System.Globalization;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// Reads the tiles of a plane: its rows of the table, then their bytes of the heap. What is read is an entry for each tile,
/// followed by the bytes that the entries point to.
/// </summary>
internal static class TileRows
{
    private const string GetAgain = "get the file again";
    private const int StripBytes = 1 << 16;

    /// <summary>Bytes between tiles that are read for nothing rather than reading tile by tile.</summary>
    private const long CheapGap = 1 << 16;

    /// <summary>Reads the tiles of a plane as they stand in the file.</summary>
    /// <exception cref="StackFormatException">A row points out of the heap, or at more than a tile can take.</exception>
    public static void Read(FitsFile file, Hdu hdu, long plane, ByteBuffer raw)
    {
        int count = CountOf(hdu);
        int entryBytes = count * Unsafe.SizeOf<TileEntry>();
        byte[] rented = ArrayPool<byte>.Shared.Rent(entryBytes);
        try
        {
            Span<TileEntry> entries = MemoryMarshal.Cast<byte, TileEntry>(rented.AsSpan(0, entryBytes));
            ReadEntries(file, hdu, plane, entries);
            long total = 0, start = long.MaxValue, end = 0;
            foreach (TileEntry entry in entries)
            {
                total += entry.Length;
                start = Math.Min(start, entry.Offset);
                end = Math.Max(end, entry.Offset + entry.Length);
            }

            bool isOnePiece = end - start <= total + CheapGap;
            long bytes = entryBytes + (isOnePiece ? end - start : total);
            if (bytes > Array.MaxLength)
                throw new StackFormatException(hdu.Where, string.Create(CultureInfo.InvariantCulture, $"the tiles of plane {plane} take {bytes} bytes, more than 2 GiB"), "unpack the file with the program that made it");
            Span<byte> buffer = raw.Resize((int)bytes);
            long heap = hdu.DataOffset + hdu.Tiles!.HeapOffset;
            if (isOnePiece)
                file.Read(buffer[entryBytes..], heap + start);
            int at = entryBytes;
            foreach (ref TileEntry entry in entries)
            {
                if (!isOnePiece)
                    file.Read(buffer.Slice(at, entry.Length), heap + entry.Offset);
                entry = entry with { Offset = isOnePiece ? entryBytes + entry.Offset - start : at };
                at += entry.Length;
            }

            rented.AsSpan(0, entryBytes).CopyTo(buffer);
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(rented);
        }
    }

    /// <summary>The entries in front of what <see cref="Read"/> gave.</summary>
    /// <exception cref="StackFormatException">There are fewer bytes than entries.</exception>
    public static ReadOnlySpan<TileEntry> Entries(Hdu hdu, ReadOnlySpan<byte> raw)
    {
        int bytes = CountOf(hdu) * Unsafe.SizeOf<TileEntry>();
        return raw.Length >= bytes
            ? MemoryMarshal.Cast<byte, TileEntry>(raw[..bytes])
            : throw new StackFormatException(hdu.Where, string.Create(CultureInfo.InvariantCulture, $"{raw.Length} bytes where the tiles of a plane take {bytes} and more"), GetAgain);
    }

    /// <summary>Planes whose tiles are all in a truncated file, up to the first one that is not.</summary>
    public static long WholePlanes(FitsFile file, Hdu hdu)
    {
        TiledImage image = hdu.Tiles!;
        if (image.HeapOffset > hdu.PresentBytes)
            return 0;
        TileEntry[] entries = new TileEntry[CountOf(hdu)];
        for (long plane = 0; plane < hdu.PromisedPlanes; plane++)
        {
            ReadEntries(file, hdu, plane, entries);
            foreach (TileEntry entry in entries)
            {
                if (image.HeapOffset + entry.Offset + entry.Length > hdu.PresentBytes)
                    return plane;
            }
        }

        return hdu.PromisedPlanes;
    }

    /// <summary>Where a tile stands, for errors.</summary>
    public static string Place(Hdu hdu, long tile) => string.Create(CultureInfo.InvariantCulture, $"{hdu.Where}, row {tile + 1} of the tiles");

    private static int CountOf(Hdu hdu)
    {
        long count = hdu.Tiles!.Grid.TilesOfPlane;
        return count * Unsafe.SizeOf<TileEntry>() <= Array.MaxLength / 2
            ? (int)count
            : throw new StackFormatException($"{hdu.Where}, keywords ZTILEn", $"{count} tiles in a plane do not fit memory", "unpack the file with the program that made it");
    }

    private static void ReadEntries(FitsFile file, Hdu hdu, long plane, Span<TileEntry> entries)
    {
        TiledImage image = hdu.Tiles!;
        long first = image.Grid.FirstTileOf(plane);
        int rowsOfStrip = Math.Max(1, StripBytes / image.RowBytes);
        byte[] strip = ArrayPool<byte>.Shared.Rent(rowsOfStrip * image.RowBytes);
        try
        {
            for (int done = 0; done < entries.Length;)
            {
                int rows = Math.Min(rowsOfStrip, entries.Length - done);
                file.Read(strip.AsSpan(0, rows * image.RowBytes), hdu.DataOffset + ((first + done) * image.RowBytes));
                for (int i = 0; i < rows; i++, done++)
                    entries[done] = ReadEntry(hdu, strip.AsSpan(i * image.RowBytes, image.RowBytes), first + done, image.Grid.PartOf(plane, done));
            }
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(strip);
        }
    }

    private static TileEntry ReadEntry(Hdu hdu, ReadOnlySpan<byte> row, long tile, TilePart part)
    {
        TiledImage image = hdu.Tiles!;
        foreach ((TileSource source, TileColumn? column) in (ReadOnlySpan<(TileSource, TileColumn?)>)[(TileSource.Compressed, image.Compressed), (TileSource.Gzipped, image.Gzipped), (TileSource.Uncompressed, image.Uncompressed)])
        {
            if (column is null)
                continue;
            (long elements, long offset) = Descriptor(row[column.Offset..], column.Type);
            if (elements == 0)
                continue;

            // No coding of the standard takes 16 bytes a sample; a longer array is no tile, or the work of a fool.
            Int128 bytes = (Int128)elements * TileColumn.NumberBytes(column.HeapType);
            long most = (16L * part.TileSamples) + 4096;
            if (elements < 0 || offset < 0 || offset + bytes > image.HeapBytes)
                throw new StackFormatException(Place(hdu, tile), string.Create(CultureInfo.InvariantCulture, $"{elements} elements at byte {offset} lie outside of the heap of {image.HeapBytes} bytes"), GetAgain);
            if (bytes > most)
                throw new StackFormatException(Place(hdu, tile), string.Create(CultureInfo.InvariantCulture, $"{bytes} bytes for a tile of {part.TileSamples} samples"), GetAgain);
            return new TileEntry(
                source,
                offset,
                (int)bytes,
                image.ScaleColumn is { } scale ? Number(row[scale.Offset..], scale.Type) : image.Scale ?? 1,
                image.ZeroColumn is { } zero ? Number(row[zero.Offset..], zero.Type) : image.Zero ?? 0,
                image.BlankColumn is { } blank ? (long)Number(row[blank.Offset..], blank.Type) : image.Blank ?? 0,
                image.BlankColumn is not null || image.Blank is not null);
        }

        throw new StackFormatException(Place(hdu, tile), "no column holds this tile", GetAgain);
    }

    /// <summary>
    /// Elements and offset of an array in the heap (Standard 4.0, section 7.3.5). Offsets of 32 bits are taken without a
    /// sign, as heaps of 2 to 4 GiB are written in practice.
    /// </summary>
    private static (long Elements, long Offset) Descriptor(ReadOnlySpan<byte> cell, char type) => type == 'P'
        ? (BinaryPrimitives.ReadInt32BigEndian(cell), BinaryPrimitives.ReadUInt32BigEndian(cell[4..]))
        : (BinaryPrimitives.ReadInt64BigEndian(cell), BinaryPrimitives.ReadInt64BigEndian(cell[8..]));

    private static double Number(ReadOnlySpan<byte> cell, char type) => type switch
    {
        'B' => cell[0],
        'I' => BinaryPrimitives.ReadInt16BigEndian(cell),
        'J' => BinaryPrimitives.ReadInt32BigEndian(cell),
        'K' => BinaryPrimitives.ReadInt64BigEndian(cell),
        'E' => BinaryPrimitives.ReadSingleBigEndian(cell),
        _ => BinaryPrimitives.ReadDoubleBigEndian(cell),
    };
}
