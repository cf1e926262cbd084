using System.Buffers.Binary;
using System.Runtime.InteropServices;

namespace Stacks.Formats.Tiff;

/// <summary>Byte order and places of samples.</summary>
internal static class SampleBytes
{
    /// <summary>Copies samples of 1, 2, 4 or 8 bytes and reverses the bytes of each. Source and destination may be the same.</summary>
    public static void CopyReversed(ReadOnlySpan<byte> source, Span<byte> destination, int size)
    {
        switch (size)
        {
            case 2:
                BinaryPrimitives.ReverseEndianness(MemoryMarshal.Cast<byte, ushort>(source), MemoryMarshal.Cast<byte, ushort>(destination));
                break;
            case 4:
                BinaryPrimitives.ReverseEndianness(MemoryMarshal.Cast<byte, uint>(source), MemoryMarshal.Cast<byte, uint>(destination));
                break;
            case 8:
                BinaryPrimitives.ReverseEndianness(MemoryMarshal.Cast<byte, ulong>(source), MemoryMarshal.Cast<byte, ulong>(destination));
                break;
            default:
                source.CopyTo(destination);
                break;
        }
    }

    /// <summary>Takes every n-th sample of 1, 2, 4 or 8 bytes.</summary>
    /// <param name="source">Samples, from the first that is taken on.</param>
    /// <param name="n">Distance of samples that are taken.</param>
    /// <param name="destination">Receives as many as it holds.</param>
    /// <param name="size">Bytes of a sample.</param>
    public static void Gather(ReadOnlySpan<byte> source, int n, Span<byte> destination, int size)
    {
        switch (size)
        {
            case 1: Gather(source, n, destination); break;
            case 2: Gather(MemoryMarshal.Cast<byte, ushort>(source), n, MemoryMarshal.Cast<byte, ushort>(destination)); break;
            case 4: Gather(MemoryMarshal.Cast<byte, uint>(source), n, MemoryMarshal.Cast<byte, uint>(destination)); break;
            default: Gather(MemoryMarshal.Cast<byte, ulong>(source), n, MemoryMarshal.Cast<byte, ulong>(destination)); break;
        }
    }

    private static void Gather<T>(ReadOnlySpan<T> source, int n, Span<T> destination)
    {
        for (int i = 0, at = 0; i < destination.Length; i++, at += n)
            destination[i] = source[at];
    }
}
