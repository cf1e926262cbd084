using System.Buffers.Binary;
using System.Numerics;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// How samples of a type stand in a data unit: big-endian, two's complement or IEEE 754; types whose sign FITS does not
/// know are stored with their top bit inverted and a BZERO that undoes it (Standard 4.0, section 4.4.2.5, table 11).
/// </summary>
internal static class SampleEncoding
{
    /// <summary>Bytes that are swapped and inverted while they are in the nearest cache.</summary>
    private const int ChunkBytes = 16384;

    /// <summary>The BITPIX of a type that FITS can hold.</summary>
    public static int BitPix(SampleType type) => type switch
    {
        SampleType.Float32 => -32,
        SampleType.Float64 => -64,
        _ => 8 * type.Size(),
    };

    /// <summary>The type that a BITPIX means without BZERO.</summary>
    public static SampleType PlainType(int bitPix) => bitPix switch
    {
        8 => SampleType.UInt8,
        16 => SampleType.Int16,
        32 => SampleType.Int32,
        64 => SampleType.Int64,
        -32 => SampleType.Float32,
        _ => SampleType.Float64,
    };

    /// <summary>The type that a BITPIX means with its sign convention's BZERO; the plain type where there is none.</summary>
    public static SampleType ShiftedType(int bitPix) => bitPix switch
    {
        8 => SampleType.Int8,
        16 => SampleType.UInt16,
        32 => SampleType.UInt32,
        64 => SampleType.UInt64,
        _ => PlainType(bitPix),
    };

    /// <summary>The BZERO of a type's sign convention: 2^15, 2^31, 2^63, -128; 0 for types that need none.</summary>
    public static Int128 Shift(SampleType type) => type switch
    {
        SampleType.Int8 => -128,
        SampleType.UInt16 => 1 << 15,
        SampleType.UInt32 => 1L << 31,
        SampleType.UInt64 => (Int128)1 << 63,
        _ => 0,
    };

    /// <summary>Bytes of a data unit to stored samples, little-endian. The spans have one length and do not overlap.</summary>
    public static void Decode(SampleType type, ReadOnlySpan<byte> data, Span<byte> stored)
    {
        for (int at = 0; at < data.Length; at += ChunkBytes)
        {
            int length = Math.Min(ChunkBytes, data.Length - at);
            Span<byte> chunk = stored.Slice(at, length);
            Swap(type, data.Slice(at, length), chunk);
            if (Shift(type) != 0)
                InvertTopBits(type, chunk);
        }
    }

    /// <summary>Stored samples, little-endian, to bytes of a data unit. The stored samples are overwritten.</summary>
    public static void Encode(SampleType type, Span<byte> stored, Span<byte> data)
    {
        for (int at = 0; at < stored.Length; at += ChunkBytes)
        {
            int length = Math.Min(ChunkBytes, stored.Length - at);
            Span<byte> chunk = stored.Slice(at, length);
            if (Shift(type) != 0)
                InvertTopBits(type, chunk);
            Swap(type, chunk, data.Slice(at, length));
        }
    }

    private static void Swap(SampleType type, ReadOnlySpan<byte> from, Span<byte> to)
    {
        switch (type.Size())
        {
            case 1:
                from.CopyTo(to);
                break;
            case 2:
                BinaryPrimitives.ReverseEndianness(MemoryMarshal.Cast<byte, ushort>(from), MemoryMarshal.Cast<byte, ushort>(to));
                break;
            case 4:
                BinaryPrimitives.ReverseEndianness(MemoryMarshal.Cast<byte, uint>(from), MemoryMarshal.Cast<byte, uint>(to));
                break;
            default:
                BinaryPrimitives.ReverseEndianness(MemoryMarshal.Cast<byte, ulong>(from), MemoryMarshal.Cast<byte, ulong>(to));
                break;
        }
    }

    /// <summary>Adds or takes half the range in integer arithmetic: inverts the top bit of every little-endian sample.</summary>
    private static void InvertTopBits(SampleType type, Span<byte> samples)
    {
        int size = type.Size();
        ulong pattern = size switch
        {
            1 => 0x8080_8080_8080_8080,
            2 => 0x8000_8000_8000_8000,
            4 => 0x8000_0000_8000_0000,
            _ => 0x8000_0000_0000_0000,
        };

        Span<Vector<ulong>> wide = MemoryMarshal.Cast<byte, Vector<ulong>>(samples);
        Vector<ulong> patterns = new(pattern);
        for (int i = 0; i < wide.Length; i++)
            wide[i] ^= patterns;
        for (int i = (wide.Length * Vector<byte>.Count) + size - 1; i < samples.Length; i += size)
            samples[i] ^= 0x80;
    }
}
