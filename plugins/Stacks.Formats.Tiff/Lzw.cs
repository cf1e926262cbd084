using System.Globalization;

namespace Stacks.Formats.Tiff;

/// <summary>
/// LZW decompression (TIFF 6.0, section 13): codes of 9 to 12 bits, most significant bit first, 256 clears the table,
/// 257 ends the data, and the width grows one code early (at 511, 1023 and 2047 entries). Every table string is the
/// string before it and one byte more, which stand together in the output: the table holds their place and length there.
/// </summary>
internal static class Lzw
{
    private const int Clear = 256;
    private const int End = 257;
    private const int TableSize = 4096;

    /// <summary>Decodes until the output is full.</summary>
    /// <param name="source">Compressed bytes.</param>
    /// <param name="output">Receives the bytes; more than fit are not decoded.</param>
    /// <returns>Null, or what is wrong with the data.</returns>
    public static string? Decode(ReadOnlySpan<byte> source, Span<byte> output)
    {
        if (source.Length >= 2 && source[0] == 0 && (source[1] & 1) != 0)
            return "the LZW codes are stored least significant bit first, as before TIFF 6.0, which is not read";

        Span<int> places = stackalloc int[TableSize];
        Span<int> lengths = stackalloc int[TableSize];
        int next = End + 1;
        int width = 9;
        int done = 0;
        int previousLength = 0;
        ulong bits = 0;
        int bitCount = 0;
        int at = 0;
        while (done < output.Length)
        {
            while (bitCount < width && at < source.Length)
            {
                bits = (bits << 8) | source[at++];
                bitCount += 8;
            }

            if (bitCount < width)
                return Short(done, output.Length);
            bitCount -= width;
            int code = (int)(bits >> bitCount) & ((1 << width) - 1);
            if (code == End)
                return Short(done, output.Length);
            if (code == Clear)
            {
                next = End + 1;
                width = 9;
                previousLength = 0;
                continue;
            }

            // The entry that this code completes: the previous string and the first byte of the string that follows it here.
            if (previousLength > 0 && next < TableSize)
            {
                places[next] = done - previousLength;
                lengths[next] = previousLength + 1;
                next++;
            }

            if (code < Clear)
            {
                output[done++] = (byte)code;
                previousLength = 1;
            }
            else if (code < next)
            {
                int place = places[code];
                int length = Math.Min(lengths[code], output.Length - done);
                for (int i = 0; i < length; i++)
                    output[done + i] = output[place + i];
                done += length;
                previousLength = length;
            }
            else
            {
                return string.Create(CultureInfo.InvariantCulture, $"LZW code {code} stands where the table has {next} entries");
            }

            width = next switch { < 511 => 9, < 1023 => 10, < 2047 => 11, _ => 12 };
        }

        return null;
    }

    private static string Short(int done, int wanted) =>
        string.Create(CultureInfo.InvariantCulture, $"the LZW data end after {done} of {wanted} bytes");
}
