using System.Buffers.Binary;
using System.Globalization;
using System.Text;

namespace Stacks.Tests.Samples;

/// <summary>
/// A small FITS reader that shares nothing with the plugin under test: image planes as physical values, by the
/// structure rules of the FITS Standard 4.0 (sections 3, 4.4, 5.2 and 7.1). Tables are stepped over.
/// </summary>
internal static class PlainFits
{
    /// <summary>Every plane of every image, in file order.</summary>
    public static List<PlainPlane> Read(string path)
    {
        byte[] file = File.ReadAllBytes(path);
        List<PlainPlane> planes = [];
        for (int at = 0; at < file.Length;)
        {
            Dictionary<string, string> header = Header(file, ref at);
            int bits = Integer(header, "BITPIX", 8), axes = Integer(header, "NAXIS", 0);
            int[] sides = [.. Enumerable.Range(1, axes).Select(n => Integer(header, $"NAXIS{n}", 0))];
            int samples = axes == 0 ? 0 : sides.Aggregate(1, (product, side) => product * side);
            int bytes = Math.Abs(bits) / 8 * (samples + Integer(header, "PCOUNT", 0));
            if (axes >= 2 && header.GetValueOrDefault("XTENSION", "'IMAGE'").Contains("IMAGE", StringComparison.Ordinal))
                planes.AddRange(Planes(file.AsSpan(at, bytes), bits, sides[0], sides[1], header));
            at += (bytes + 2879) / 2880 * 2880;
        }

        return planes;
    }

    private static Dictionary<string, string> Header(byte[] file, ref int at)
    {
        Dictionary<string, string> header = [];
        while (true)
        {
            string card = Encoding.ASCII.GetString(file, at, 80);
            at += 80;
            if (card.StartsWith("END     ", StringComparison.Ordinal))
                break;
            if (card.AsSpan(8, 2) is "= ")
                header[card[..8].TrimEnd()] = card[10..].Split('/')[0].Trim();
        }

        at = (at + 2879) / 2880 * 2880;
        return header;
    }

    private static List<PlainPlane> Planes(ReadOnlySpan<byte> data, int bits, int width, int height, Dictionary<string, string> header)
    {
        double scale = Real(header, "BSCALE", 1), zero = Real(header, "BZERO", 0);
        int size = Math.Abs(bits) / 8, length = width * height;
        List<PlainPlane> planes = [];
        for (int start = 0; start < data.Length; start += size * length)
        {
            double[] values = new double[length];
            for (int i = 0; i < length; i++)
            {
                ReadOnlySpan<byte> sample = data.Slice(start + (size * i), size);
                double stored = bits switch
                {
                    8 => sample[0],
                    16 => BinaryPrimitives.ReadInt16BigEndian(sample),
                    -32 => BinaryPrimitives.ReadSingleBigEndian(sample),
                    -64 => BinaryPrimitives.ReadDoubleBigEndian(sample),
                    _ => throw new NotSupportedException($"BITPIX {bits} is not in the samples"),
                };
                values[i] = zero + (scale * stored);
            }

            planes.Add(new PlainPlane(header.GetValueOrDefault("EXTNAME", "").Trim('\'', ' '), bits, width, height, values));
        }

        return planes;
    }

    private static int Integer(Dictionary<string, string> header, string keyword, int otherwise) =>
        header.TryGetValue(keyword, out string? text) ? int.Parse(text, CultureInfo.InvariantCulture) : otherwise;

    private static double Real(Dictionary<string, string> header, string keyword, double otherwise) =>
        header.TryGetValue(keyword, out string? text) ? double.Parse(text, CultureInfo.InvariantCulture) : otherwise;
}

/// <summary>One plane of physical values.</summary>
/// <param name="Name">EXTNAME, or empty.</param>
/// <param name="Bits">BITPIX, or bits of a sample.</param>
/// <param name="Width">Columns.</param>
/// <param name="Height">Rows.</param>
/// <param name="Values">Row after row.</param>
internal sealed record PlainPlane(string Name, int Bits, int Width, int Height, double[] Values)
{
    /// <summary>The value at column x of row y.</summary>
    public double this[int x, int y] => Values[(y * Width) + x];
}
