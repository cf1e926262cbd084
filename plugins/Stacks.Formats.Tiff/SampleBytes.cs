using System.Buffers.Binary;
using System.Runtime.InteropServices;

namespace Stacks.Formats.Tiff;

/// <summary>Byte order of samples.</summary>
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
}
