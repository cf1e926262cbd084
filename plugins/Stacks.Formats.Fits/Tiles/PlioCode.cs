using System.Buffers.Binary;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// The pixel list code PLIO_1 (FITS Standard 4.0, section 10.4.3): runs of zeros and of a "high value", in 16-bit words,
/// big-endian, of a 4-bit instruction and 12 bits of data.
/// </summary>
internal static class PlioCode
{
    private const int DataBits = 12;

    /// <summary>Decodes a tile.</summary>
    /// <param name="stream">The tile's bytes.</param>
    /// <param name="pixels">Receives the pixels, 0 to 2^24 - 1.</param>
    /// <returns>What is wrong with the stream; null when nothing is.</returns>
    public static string? Decode(ReadOnlySpan<byte> stream, Span<int> pixels)
    {
        int words = stream.Length / sizeof(short);
        if (words < 3)
            return "it ends inside its header";

        // The third word of the older header is the length of the list; in the newer one it is negative and a longer length follows.
        int Word(ReadOnlySpan<byte> bytes, int index) => BinaryPrimitives.ReadInt16BigEndian(bytes[(sizeof(short) * index)..]);
        int first = 3, end = Word(stream, 2);
        if (end <= 0)
        {
            if (words < 5)
                return "it ends inside its header";
            first = Word(stream, 1);
            end = (Word(stream, 4) << 15) + Word(stream, 3);
        }

        if (first < 0 || end < first || end > words)
            return $"its list runs from word {first} to word {end} of {words}";

        int at = 0, high = 1;
        for (int i = first; i < end; i++)
        {
            int word = (ushort)Word(stream, i);
            int data = word & ((1 << DataBits) - 1);
            int run = 0;
            switch (word >> DataBits)
            {
                case 0 or 4 or 5:
                    run = data;
                    break;
                case 1:
                    if (++i == end)
                        return "it ends inside an instruction";
                    high = (Word(stream, i) << DataBits) + data;
                    break;
                case 2:
                    high += data;
                    break;
                case 3:
                    high -= data;
                    break;
                case 6:
                    high += data;
                    run = 1;
                    break;
                case 7:
                    high -= data;
                    run = 1;
                    break;
                default:
                    return $"word {i} is no instruction";
            }

            if (run > pixels.Length - at)
                return $"it holds more than {pixels.Length} pixels";
            Span<int> pixelsOfRun = pixels.Slice(at, run);
            at += run;
            switch (word >> DataBits)
            {
                case 0:
                    pixelsOfRun.Clear();
                    break;
                case 5 when run > 0:
                    pixelsOfRun.Clear();
                    pixelsOfRun[^1] = high;
                    break;
                default:
                    pixelsOfRun.Fill(high);
                    break;
            }
        }

        pixels[at..].Clear();
        return null;
    }
}
