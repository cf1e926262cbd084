using System.Buffers.Binary;
using System.Globalization;
using System.Text;

namespace Stacks.Tests.Cli;

/// <summary>Small files written straight from the standards' rules: FITS 4.0 and TIFF 6.0.</summary>
internal static class SmallFiles
{
    /// <summary>An unsigned 16-bit FITS cube (BITPIX 16, BZERO 32768) of width x height x frames samples.</summary>
    public static byte[] Fits(int width, int height, int frames, Func<int, int, int, int> sample)
    {
        byte[] data = new byte[Padded(width * height * frames * 2)];
        int at = 0;
        for (int f = 0; f < frames; f++)
        {
            for (int y = 0; y < height; y++)
            {
                for (int x = 0; x < width; x++, at += 2)
                    BinaryPrimitives.WriteInt16BigEndian(data.AsSpan(at), (short)(sample(x, y, f) - 32768));
            }
        }

        return [.. Header(
            Card("SIMPLE", "T"), Card("BITPIX", "16"), Card("NAXIS", "3"), Card("NAXIS1", width), Card("NAXIS2", height), Card("NAXIS3", frames),
            Card("BZERO", "32768"), Card("BSCALE", "1")), .. data];
    }

    /// <summary>The samples of a FITS file that <see cref="Fits"/> or a run over it made: those of its first header's data.</summary>
    public static int[] SamplesOf(string path, int count)
    {
        byte[] bytes = File.ReadAllBytes(path);
        int end = 0;
        while (Encoding.ASCII.GetString(bytes, end, 80).TrimEnd() != "END")
            end += 80;
        int start = Padded(end + 80);
        return [.. Enumerable.Range(0, count).Select(i => BinaryPrimitives.ReadInt16BigEndian(bytes.AsSpan(start + (2 * i))) + 32768)];
    }

    /// <summary>A header that promises 999 axes and no data.</summary>
    public static byte[] FitsOf999Axes() => Header(
        [Card("SIMPLE", "T"), Card("BITPIX", "16"), Card("NAXIS", "999"), .. Enumerable.Range(1, 999).Select(i => Card("NAXIS" + i.ToString(CultureInfo.InvariantCulture), "2"))]);

    /// <summary>A little-endian TIFF of 4 x 2 samples of a number of bits each, one strip, not compressed.</summary>
    public static byte[] Tiff(int bits)
    {
        (int Tag, int Type, int Value)[] entries =
        [
            (256, 4, 4), (257, 4, 2), (258, 3, bits), (259, 3, 1), (262, 3, 1), (273, 4, 122), (277, 3, 1), (278, 4, 2), (279, 4, bits),
        ];
        byte[] file = new byte[122 + bits];
        "II*\0"u8.CopyTo(file);
        BinaryPrimitives.WriteInt32LittleEndian(file.AsSpan(4), 8);
        BinaryPrimitives.WriteInt16LittleEndian(file.AsSpan(8), (short)entries.Length);
        for (int i = 0; i < entries.Length; i++)
        {
            Span<byte> entry = file.AsSpan(10 + (12 * i), 12);
            BinaryPrimitives.WriteInt16LittleEndian(entry, (short)entries[i].Tag);
            BinaryPrimitives.WriteInt16LittleEndian(entry[2..], (short)entries[i].Type);
            BinaryPrimitives.WriteInt32LittleEndian(entry[4..], 1);
            BinaryPrimitives.WriteInt32LittleEndian(entry[8..], entries[i].Value);
        }

        return file;
    }

    private static byte[] Header(params string[] cards)
    {
        string text = string.Concat(cards) + "END".PadRight(80);
        return Encoding.ASCII.GetBytes(text.PadRight(Padded(text.Length)));
    }

    private static string Card(string keyword, int value) => Card(keyword, value.ToString(CultureInfo.InvariantCulture));

    private static string Card(string keyword, string value) => (keyword.PadRight(8) + "= " + value.PadLeft(20)).PadRight(80);

    private static int Padded(int length) => (length + 2879) / 2880 * 2880;
}
