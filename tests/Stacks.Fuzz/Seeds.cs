using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;

namespace Stacks.Fuzz;

/// <summary>Good inputs for each target, which the fuzzer starts from; made anew, so that none is kept in the repository.</summary>
internal static class Seeds
{
    private const int Side = 16;

    /// <summary>The seeds of a target.</summary>
    public static IEnumerable<byte[]> Of(string target)
    {
        int[] pixels = [.. Enumerable.Range(0, Side * Side).Select(i => 1000 + (i * i % 37) + (i == 100 ? 20000 : 0))];
        byte[] sides = [Side - 1, Side - 1];
        switch (target)
        {
            case "fits-header":
                yield return Header("SIMPLE  =                    T", "BITPIX  =                   16", "NAXIS   =                    3", "NAXIS1  =                    4",
                    "NAXIS2  =                    3", "NAXIS3  =                    2", "BZERO   =                32768", "BLANK   =                    7", "OBSERVER= 'a ''b''  &'", "CONTINUE  'more'",
                    "HIERARCH some key = 1.5E3 / c", "COMMENT  text", "BSCALE  =                  1.5");
                yield return Header("SIMPLE  =                    T", "BITPIX  =                    8", "NAXIS   =                    0", "EXTEND  =                    T");
                yield return TableOfTiles();
                break;
            case "fits-rice":
                byte[] rice = new byte[RiceCode.MostBytes<int>(pixels.Length, Side)];
                yield return [.. sides, .. rice.AsSpan(0, RiceCode.Encode<int>(pixels, Side, rice))];
                break;
            case "fits-gzip":
                ByteBuffer gzip = new();
                GzipTile.Encode(MemoryMarshal.AsBytes(pixels.AsSpan()), gzip);
                yield return [.. sides, .. gzip.Written];
                break;
            case "fits-plio":
                yield return [.. sides, 0, 0, 0, 7, 0xFF, 0x9C, 0, 12, 0, 0, 0, 0, 0, 3, 0x20, 4, 0x40, 2, 0x50, 3, 0x10, 1, 0, 2];
                break;
            case "fits-hcompress":
                yield return [.. sides, 0xDD, 0x99, 0, 0, 0, Side, 0, 0, 0, Side, 0, 0, 0, 4, 0, 0, 0, 0, 0, 0, 1, 0, 2, 1, 1, .. Enumerable.Range(0, 60).Select(i => (byte)(i * 77))];
                // 7 x 5 pixels of noise with two spikes, compressed by astropy 5.2.1.
                yield return [6, 4, .. Convert.FromHexString(
                    "dd9900000005000000070000000000000000000001400b0a0af43de81e6201e623d8fd5fff7c40f09003f91e17fdec7b1ff7b1eefe9f3ca0608805ac8ffbd8f63fef"
                    + "60180058050244343fef63d8ffbd8f6c10bdc01107d06900bbe018d700")];
                break;
            case "tiff-directory":
                foreach (bool bigEndian in new[] { false, true })
                    yield return Tiff(bigEndian);
                break;
            case "tiff-lzw":
                // TIFF 6.0, section 13: 7 7 7 8 8 7 7 6 6 as Clear 7 258 8 8 258 6 6 End in 9 bits each.
                yield return [.. sides, .. Bits(9, 256, 7, 258, 8, 8, 258, 6, 6, 257)];
                break;
            case "tiff-packbits":
                // The example of TIFF 6.0, section 9.
                yield return [.. sides, 0xFE, 0xAA, 0x02, 0x80, 0x00, 0x2A, 0xFD, 0xAA, 0x03, 0x80, 0x00, 0x2A, 0x22, 0xF7, 0xAA];
                break;
            default:
                yield return [5, 3, .. MemoryMarshal.AsBytes(pixels.AsSpan())];
                break;
        }
    }

    private static byte[] Header(params string[] cards)
    {
        string text = string.Concat(cards.Append("END").Select(c => c.PadRight(80)));
        return [.. System.Text.Encoding.ASCII.GetBytes(text.PadRight((text.Length + 2879) / 2880 * 2880)), .. new byte[2880]];
    }

    /// <summary>An image of 16 x 2 samples of 16 bits in two tiles of RICE_1, behind an empty primary.</summary>
    private static byte[] TableOfTiles()
    {
        short[] row = [.. Enumerable.Range(0, Side).Select(i => (short)(200 + (i * i % 13)))];
        byte[] tile = new byte[RiceCode.MostBytes<short>(Side, 32)];
        int length = RiceCode.Encode<short>(row, 32, tile);
        byte[] table =
        [
            .. Header(
                "XTENSION= 'BINTABLE'", "BITPIX  =                    8", "NAXIS   =                    2", "NAXIS1  =                    8", "NAXIS2  =                    2",
                $"PCOUNT  = {length,20}", "GCOUNT  =                    1", "TFIELDS =                    1", "TTYPE1  = 'COMPRESSED_DATA'", $"TFORM1  = '1PB({length})'",
                "ZIMAGE  =                    T", "ZBITPIX =                   16", "ZNAXIS  =                    2", "ZNAXIS1 =                   16", "ZNAXIS2 =                    2",
                "ZTILE1  =                   16", "ZTILE2  =                    1", "ZCMPTYPE= 'RICE_1'", "ZNAME1  = 'BLOCKSIZE'", "ZVAL1   =                   32",
                "ZNAME2  = 'BYTEPIX'", "ZVAL2   =                    2"),
        ];
        byte[] descriptor = [0, 0, 0, (byte)length, 0, 0, 0, 0];
        ((byte[])[.. descriptor, .. descriptor, .. tile.AsSpan(0, length)]).CopyTo(table, table.Length - 2880);
        byte[] primary = Header("SIMPLE  =                    T", "BITPIX  =                    8", "NAXIS   =                    0", "EXTEND  =                    T");
        return [.. primary.AsSpan(0, 2880), .. table];
    }

    private static byte[] Bits(int width, params int[] codes)
    {
        string bits = string.Concat(codes.Select(c => Convert.ToString(c, 2).PadLeft(width, '0')));
        return [.. bits.PadRight((bits.Length + 7) / 8 * 8, '0').Chunk(8).Select(b => Convert.ToByte(new string(b), 2))];
    }

    /// <summary>A page of 4 x 2 samples of 16 bits, with a directory of the fields that TIFF 6.0 asks for.</summary>
    private static byte[] Tiff(bool bigEndian)
    {
        byte[] Number(int value, int size)
        {
            byte[] bytes = [.. Enumerable.Range(0, size).Select(i => (byte)(value >> (8 * i)))];
            return bigEndian ? [.. bytes.Reverse()] : bytes;
        }

        (int Tag, int Type, int Value)[] fields =
            [(256, 4, 4), (257, 4, 2), (258, 3, 16), (259, 3, 1), (262, 3, 1), (273, 4, 122), (277, 3, 1), (278, 4, 2), (279, 4, 16)];
        List<byte> file = [.. bigEndian ? "MM"u8 : "II"u8, .. Number(42, 2), .. Number(8, 4), .. Number(fields.Length, 2)];
        foreach ((int tag, int type, int value) in fields)
            file.AddRange([.. Number(tag, 2), .. Number(type, 2), .. Number(1, 4), .. Number(value, type == 3 ? 2 : 4), .. new byte[type == 3 ? 2 : 0]]);
        return [.. file, .. Number(0, 4), .. new byte[122 - file.Count - 4], .. Enumerable.Range(0, 16).Select(i => (byte)i)];
    }
}
