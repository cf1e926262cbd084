using System.Numerics;
using System.Runtime.InteropServices;

namespace Stacks.Formats.Tiff;

/// <summary>
/// Predictor 2: stored[x] = sample[x] - sample[x - n] modulo 2^bits, each row by itself, the first n samples as they are,
/// where n samples of a pixel stand side by side (TIFF 6.0, section 14). Floats are differenced as the integers of their bits, as libtiff does. Samples are
/// little-endian here: byte order is undone before and made after.
/// </summary>
internal static class HorizontalPredictor
{
    /// <summary>sample[x] = stored[x] + sample[x - n], in place.</summary>
    public static void Undo(Span<byte> bytes, int rowBytes, int size, int n)
    {
        for (int at = 0; at < bytes.Length; at += rowBytes)
        {
            Span<byte> row = bytes.Slice(at, rowBytes);
            switch (size)
            {
                case 1: Sum(row, n); break;
                case 2: Sum(MemoryMarshal.Cast<byte, ushort>(row), n); break;
                case 4: Sum(MemoryMarshal.Cast<byte, uint>(row), n); break;
                default: Sum(MemoryMarshal.Cast<byte, ulong>(row), n); break;
            }
        }
    }

    /// <summary>stored[x] = sample[x] - sample[x - 1] in one plane, in place.</summary>
    public static void Apply(Span<byte> bytes, int rowBytes, int size)
    {
        for (int at = 0; at < bytes.Length; at += rowBytes)
        {
            Span<byte> row = bytes.Slice(at, rowBytes);
            switch (size)
            {
                case 1: Differences(row); break;
                case 2: Differences(MemoryMarshal.Cast<byte, ushort>(row)); break;
                case 4: Differences(MemoryMarshal.Cast<byte, uint>(row)); break;
                default: Differences(MemoryMarshal.Cast<byte, ulong>(row)); break;
            }
        }
    }

    private static void Sum<T>(Span<T> row, int n)
        where T : IBinaryInteger<T>
    {
        if (n == 1)
        {
            T sum = T.Zero;
            for (int x = 0; x < row.Length; x++)
            {
                sum = unchecked(sum + row[x]);
                row[x] = sum;
            }
        }
        else
        {
            for (int x = n; x < row.Length; x++)
                row[x] = unchecked(row[x] + row[x - n]);
        }
    }

    private static void Differences<T>(Span<T> row)
        where T : IBinaryInteger<T>
    {
        for (int x = row.Length - 1; x > 0; x--)
            row[x] = unchecked(row[x] - row[x - 1]);
    }
}
