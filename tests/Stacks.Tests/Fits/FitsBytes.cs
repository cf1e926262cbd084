using System.Buffers.Binary;
using System.Globalization;
using System.Text;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;

namespace Stacks.Tests.Fits;

/// <summary>
/// Builds FITS files byte by byte from the standard's text (4.0, sections 3.1, 3.3 and 4.1), without the code under test.
/// </summary>
internal sealed class FitsBytes
{
    private readonly List<byte> bytes = [];

    public static string Card(string keyword, object value, string comment = "") =>
        $"{keyword,-8}= {Convert.ToString(value, CultureInfo.InvariantCulture),20}" + (comment.Length > 0 ? $" / {comment}" : "");

    public static string Text(string keyword, string value) => $"{keyword,-8}= '{value,-8}'";

    public FitsBytes Hdu(IEnumerable<string> cards, byte[] data)
    {
        StringBuilder header = new();
        foreach (string card in cards.Append("END"))
            header.Append(card.PadRight(80));
        while (header.Length % 2880 != 0)
            header.Append(' ');
        bytes.AddRange(Encoding.Latin1.GetBytes(header.ToString()));
        bytes.AddRange(data);
        while (bytes.Count % 2880 != 0)
            bytes.Add(0);
        return this;
    }

    public FitsBytes Primary(int bitPix, long[] axes, byte[] data, params string[] more) =>
        Hdu([Card("SIMPLE", "T"), .. Array(bitPix, axes), .. more], data);

    public FitsBytes Image(int bitPix, long[] axes, byte[] data, params string[] more) =>
        Hdu([Text("XTENSION", "IMAGE"), .. Array(bitPix, axes), Card("PCOUNT", 0), Card("GCOUNT", 1), .. more], data);

    public byte[] ToArray() => [.. bytes];

    public string Save(TemporaryFolder folder, string name = "in.fits")
    {
        File.WriteAllBytes(folder.File(name), ToArray());
        return folder.File(name);
    }

    public IStackReader Open(TemporaryFolder folder, ReadOptions? options = null, string name = "in.fits") =>
        new FitsFormat().Open(Save(folder, name), options ?? new ReadOptions());

    public static byte[] Shorts(params int[] values)
    {
        byte[] data = new byte[values.Length * 2];
        for (int i = 0; i < values.Length; i++)
            BinaryPrimitives.WriteInt16BigEndian(data.AsSpan(2 * i), (short)values[i]);
        return data;
    }

    public static byte[] Floats(params float[] values)
    {
        byte[] data = new byte[values.Length * 4];
        for (int i = 0; i < values.Length; i++)
            BinaryPrimitives.WriteSingleBigEndian(data.AsSpan(4 * i), values[i]);
        return data;
    }

    /// <summary>The cards of each HDU of a file, without END, and its data unit, found by the standard's rules alone.</summary>
    public static List<(List<string> Cards, byte[] Data)> Split(byte[] file)
    {
        List<(List<string>, byte[])> hdus = [];
        for (int at = 0; at < file.Length;)
        {
            List<string> cards = [];
            for (; ; at += 80)
            {
                string card = Encoding.Latin1.GetString(file, at, 80);
                if (card.TrimEnd() == "END")
                    break;
                cards.Add(card);
            }

            at = (at / 2880 * 2880) + 2880;
            long Value(string keyword, long otherwise) =>
                cards.FirstOrDefault(c => c.StartsWith(keyword.PadRight(8) + "=", StringComparison.Ordinal)) is { } card
                    ? long.Parse(card[10..].Split('/')[0].Trim(), CultureInfo.InvariantCulture)
                    : otherwise;
            bool isExtension = cards[0].StartsWith("XTENSION", StringComparison.Ordinal);
            long samples = Value("NAXIS", 0) == 0 ? 0 : 1;
            bool isGroups = cards.Any(c => c.StartsWith("GROUPS  =                    T", StringComparison.Ordinal));
            for (int i = isGroups ? 2 : 1; i <= Value("NAXIS", 0); i++)
                samples *= Value($"NAXIS{i}", 0);
            long size = Math.Abs(Value("BITPIX", 8)) / 8 * (isExtension || isGroups ? Value("GCOUNT", 1) : 1) * ((isExtension || isGroups ? Value("PCOUNT", 0) : 0) + samples);
            hdus.Add((cards, file[at..(int)(at + size)]));
            at += (int)((size + 2879) / 2880 * 2880);
        }

        return hdus;
    }

    private static IEnumerable<string> Array(int bitPix, long[] axes) =>
        [Card("BITPIX", bitPix), Card("NAXIS", axes.Length), .. axes.Select((axis, i) => Card($"NAXIS{i + 1}", axis))];
}
