using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// How samples of a type stand in a data unit: big-endian, two's complement or IEEE 754; types whose sign FITS does not
/// know are stored with their top bit inverted and a BZERO that undoes it (Standard 4.0, section 4.4.2.5, table 11).
/// </summary>
internal static class SampleEncoding
{
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

    /// <summary>Bytes of a data unit to stored samples, little-endian. The spans have one length; they may be the same.</summary>
    public static void Decode(SampleType type, ReadOnlySpan<byte> data, Span<byte> stored) => Reverse(type, data, stored, type.Size() - 1);

    /// <summary>Stored samples, little-endian, to bytes of a data unit. The spans have one length; they may be the same.</summary>
    public static void Encode(SampleType type, ReadOnlySpan<byte> stored, Span<byte> data) => Reverse(type, stored, data, 0);

    /// <summary>Adds or takes half the range where the type has a sign convention: inverts the top bit of every little-endian sample.</summary>
    public static void FlipSigns(SampleType type, Span<byte> stored)
    {
        if (Shift(type) == 0)
            return;
        switch (type.Size())
        {
            case 1:
                Xor(stored, (byte)0x80);
                break;
            case 2:
                Xor(MemoryMarshal.Cast<byte, ushort>(stored), (ushort)0x8000);
                break;
            case 4:
                Xor(MemoryMarshal.Cast<byte, uint>(stored), 0x8000_0000);
                break;
            default:
                Xor(MemoryMarshal.Cast<byte, ulong>(stored), 0x8000_0000_0000_0000);
                break;
        }
    }

    /// <summary>
    /// Reverses the bytes of each sample; then adds or takes half the range, in integer arithmetic, where the type has a
    /// sign convention: its top bit, which is then in byte <paramref name="top"/>, is inverted.
    /// </summary>
    private static void Reverse(SampleType type, ReadOnlySpan<byte> from, Span<byte> to, int top)
    {
        byte flip = Shift(type) != 0 ? (byte)0x80 : (byte)0;
        int size = type.Size();
        int done = size switch
        {
            1 => ReverseVectors(from, to, flip),
            2 => ReverseVectors(from, to, (ushort)(flip << (8 * top))),
            4 => ReverseVectors(from, to, (uint)flip << (8 * top)),
            _ => ReverseVectors(from, to, (ulong)flip << (8 * top)),
        };
        Span<byte> sample = stackalloc byte[8];
        for (int i = done; i < from.Length; i += size)
        {
            from.Slice(i, size).CopyTo(sample);
            for (int b = 0; b < size; b++)
                to[i + b] = sample[size - 1 - b];
            to[i + top] ^= flip;
        }
    }

    /// <summary>The same for as many whole vectors as there are; returns the bytes done.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static int ReverseVectors<T>(ReadOnlySpan<byte> from, Span<byte> to, T flip)
        where T : unmanaged
    {
        ReadOnlySpan<Vector<T>> source = MemoryMarshal.Cast<byte, Vector<T>>(from);
        Span<Vector<T>> target = MemoryMarshal.Cast<byte, Vector<T>>(to);
        Vector<T> flips = new(flip);
        for (int i = 0; i < source.Length; i++)
            target[i] = ReverseBytes(source[i]) ^ flips;
        return source.Length * Vector<byte>.Count;
    }

    /// <summary>Bytes change places inside 16 bits, then pairs inside 32, then fours inside 64, as far as the sample is wide.</summary>
    private static unsafe Vector<T> ReverseBytes<T>(Vector<T> samples)
        where T : unmanaged
    {
        Vector<ushort> halves = samples.As<T, ushort>();
        if (sizeof(T) >= 2)
            halves = (halves << 8) | (halves >>> 8);
        Vector<uint> words = halves.As<ushort, uint>();
        if (sizeof(T) >= 4)
            words = (words << 16) | (words >>> 16);
        Vector<ulong> longs = words.As<uint, ulong>();
        if (sizeof(T) >= 8)
            longs = (longs << 32) | (longs >>> 32);
        return longs.As<ulong, T>();
    }

    private static void Xor<T>(Span<T> samples, T pattern)
        where T : unmanaged, IBinaryInteger<T>
    {
        Span<Vector<T>> wide = MemoryMarshal.Cast<T, Vector<T>>(samples);
        Vector<T> patterns = new(pattern);
        for (int i = 0; i < wide.Length; i++)
            wide[i] ^= patterns;
        for (int i = wide.Length * Vector<T>.Count; i < samples.Length; i++)
            samples[i] ^= pattern;
    }
}
