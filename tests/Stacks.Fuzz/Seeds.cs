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
