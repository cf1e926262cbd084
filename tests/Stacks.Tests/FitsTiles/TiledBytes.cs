using System.Buffers.Binary;
using System.IO.Compression;
using Stacks.Abstractions;
using Stacks.Tests.Fits;

namespace Stacks.Tests.FitsTiles;

/// <summary>
/// Builds tables of tiles byte by byte from the standard's text (4.0, sections 7.3 and 10.1), without the code under test:
/// a column of the heap gives each tile its bytes or none, any other column its cell.
/// </summary>
internal sealed class TiledBytes
{
    private readonly List<(string Name, string Form, byte[]?[] Cells)> columns = [];

    /// <summary>Bytes between the table and the heap, which THEAP then gives.</summary>
    public int Gap { get; init; }

    /// <summary>A column; its form begins with 1P, 1Q, or is that of a number.</summary>
    public TiledBytes Column(string name, string form, params byte[]?[] cells)
    {
        columns.Add((name, form, cells));
        return this;
    }

    /// <summary>The table as an HDU, for an image of these axes cut in these tiles.</summary>
    public (string[] Cards, byte[] Data) Hdu(int bitPix, long[] axes, long[] tile, string compression, params string[] more)
    {
        List<byte> table = [], heap = [];
        int rows = columns[0].Cells.Length;
        for (int row = 0; row < rows; row++)
        {
            foreach ((_, string form, byte[]?[] cells) in columns)
            {
                byte[]? cell = cells[row];
                if (form[1] is not ('P' or 'Q'))
                {
                    table.AddRange(cell!);
                    continue;
                }

                byte[] descriptor = new byte[16];
                long elements = (cell?.Length ?? 0) / form[2] switch { 'I' => 2, 'J' or 'E' => 4, 'K' or 'D' => 8, _ => 1 };
                BinaryPrimitives.WriteInt64BigEndian(descriptor, elements);
                BinaryPrimitives.WriteInt64BigEndian(descriptor.AsSpan(8), heap.Count);
                table.AddRange(form[1] == 'Q' ? descriptor : [.. descriptor[4..8], .. descriptor[12..16]]);
                heap.AddRange(cell ?? []);
            }
        }

        string[] cards =
        [
            FitsBytes.Text("XTENSION", "BINTABLE"), FitsBytes.Card("BITPIX", 8), FitsBytes.Card("NAXIS", 2),
            FitsBytes.Card("NAXIS1", table.Count / rows), FitsBytes.Card("NAXIS2", rows), FitsBytes.Card("PCOUNT", Gap + heap.Count), FitsBytes.Card("GCOUNT", 1),
            FitsBytes.Card("TFIELDS", columns.Count),
            .. columns.SelectMany((column, i) => new[] { FitsBytes.Text($"TTYPE{i + 1}", column.Name), FitsBytes.Text($"TFORM{i + 1}", column.Form) }),
            .. Gap > 0 ? new[] { FitsBytes.Card("THEAP", table.Count + Gap) } : [],
            FitsBytes.Card("ZIMAGE", "T"), FitsBytes.Text("ZCMPTYPE", compression), FitsBytes.Card("ZBITPIX", bitPix), FitsBytes.Card("ZNAXIS", axes.Length),
            .. axes.Select((axis, i) => FitsBytes.Card($"ZNAXIS{i + 1}", axis)),
            .. tile.Select((axis, i) => FitsBytes.Card($"ZTILE{i + 1}", axis)),
            .. more,
        ];
        return (cards, [.. table, .. new byte[Gap], .. heap]);
    }

    /// <summary>A file with an empty primary and the table.</summary>
    public FitsBytes File(int bitPix, long[] axes, long[] tile, string compression, params string[] more)
    {
        (string[] cards, byte[] data) = Hdu(bitPix, axes, tile, compression, more);
        return new FitsBytes().Primary(8, [], []).Hdu(cards, data);
    }

    /// <summary>gzip (RFC 1952).</summary>
    public static byte[] Gzip(byte[] bytes)
    {
        using MemoryStream stream = new();
        using (GZipStream gzip = new(stream, CompressionLevel.Optimal, leaveOpen: true))
            gzip.Write(bytes);
        return stream.ToArray();
    }

    public static byte[] Ints(params int[] values) => [.. values.SelectMany(value => new[] { (byte)(value >> 24), (byte)(value >> 16), (byte)(value >> 8), (byte)value })];

    public static byte[] Doubles(params double[] values) => [.. values.SelectMany(value =>
    {
        byte[] bytes = new byte[8];
        BinaryPrimitives.WriteDoubleBigEndian(bytes, value);
        return bytes;
    })];

    /// <summary>Little-endian samples of a frame as big-endian ones.</summary>
    public static byte[] BigEndian(byte[] stored, SampleType type) => [.. stored.Chunk(type.Size()).SelectMany(sample => sample.Reverse())];
}
