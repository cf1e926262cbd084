using System.Globalization;

namespace Stacks.Formats.Tiff;

/// <summary>
/// PackBits decompression (TIFF 6.0, section 9): a byte n of 0 to 127 is followed by n + 1 bytes as they are, one of
/// -127 to -1 by a byte that stands 1 - n times, and -128 by nothing.
/// </summary>
internal static class PackBits
{
    /// <summary>Decodes until the output is full.</summary>
    /// <param name="source">Compressed bytes.</param>
    /// <param name="output">Receives the bytes; more than fit are not decoded.</param>
    /// <returns>Null, or what is wrong with the data.</returns>
    public static string? Decode(ReadOnlySpan<byte> source, Span<byte> output)
    {
        int done = 0;
        for (int at = 0; done < output.Length;)
        {
            if (at == source.Length)
                return Short(done, output.Length);
            int n = (sbyte)source[at++];
            if (n == -128)
                continue;
            int wanted = n >= 0 ? n + 1 : 1 - n;
            int inSource = n >= 0 ? wanted : 1;
            if (at + inSource > source.Length)
                return Short(done, output.Length);
            int length = Math.Min(wanted, output.Length - done);
            if (n >= 0)
                source.Slice(at, length).CopyTo(output[done..]);
            else
                output.Slice(done, length).Fill(source[at]);
            at += inSource;
            done += length;
        }

        return null;
    }

    private static string Short(int done, int wanted) =>
        string.Create(CultureInfo.InvariantCulture, $"the PackBits data end after {done} of {wanted} bytes");
}
