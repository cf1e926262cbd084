using System.Buffers;

namespace Stacks.Formats.Tiff;

/// <summary>
/// Predictor 3: the bytes of a row's samples are sorted by significance, most significant first whatever the file's byte
/// order, and then differenced byte by byte (Adobe Photoshop TIFF Technical Note 3, 2005); where n samples of a pixel stand
/// side by side, bytes n apart are differenced. Samples are little-endian.
/// </summary>
internal static class FloatingPointPredictor
{
    /// <summary>Turns stored rows into little-endian samples, in place.</summary>
    public static void Undo(Span<byte> bytes, int rowBytes, int size, int n)
    {
        int samples = rowBytes / size;
        byte[] rented = ArrayPool<byte>.Shared.Rent(rowBytes);
        Span<byte> sorted = rented.AsSpan(0, rowBytes);
        for (int at = 0; at < bytes.Length; at += rowBytes)
        {
            Span<byte> row = bytes.Slice(at, rowBytes);
            row[..n].CopyTo(sorted);
            for (int i = n; i < rowBytes; i++)
                sorted[i] = (byte)(row[i] + sorted[i - n]);

            for (int b = 0; b < size; b++)
            {
                ReadOnlySpan<byte> plane = sorted.Slice((size - 1 - b) * samples, samples);
                for (int x = 0; x < samples; x++)
                    row[(x * size) + b] = plane[x];
            }
        }

        ArrayPool<byte>.Shared.Return(rented);
    }

    /// <summary>Turns little-endian samples of one plane into stored rows, in place.</summary>
    public static void Apply(Span<byte> bytes, int rowBytes, int size)
    {
        int samples = rowBytes / size;
        byte[] rented = ArrayPool<byte>.Shared.Rent(rowBytes);
        Span<byte> sorted = rented.AsSpan(0, rowBytes);
        for (int at = 0; at < bytes.Length; at += rowBytes)
        {
            Span<byte> row = bytes.Slice(at, rowBytes);
            for (int b = 0; b < size; b++)
            {
                Span<byte> plane = sorted.Slice((size - 1 - b) * samples, samples);
                for (int x = 0; x < samples; x++)
                    plane[x] = row[(x * size) + b];
            }

            row[0] = sorted[0];
            for (int i = 1; i < rowBytes; i++)
                row[i] = (byte)(sorted[i] - sorted[i - 1]);
        }

        ArrayPool<byte>.Shared.Return(rented);
    }
}
