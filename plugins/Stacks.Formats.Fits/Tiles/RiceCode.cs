using System.Buffers.Binary;
using System.Numerics;
using System.Runtime.CompilerServices;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// The Rice code (FITS Standard 4.0, section 10.4.1; R. Rice, P.-S. Yeh and W. Miller, JPL Publication 91-3, 1991). The
/// first pixel stands as it is, big-endian. Blocks of pixels follow; of each pixel the difference d to the one before is
/// coded, which wraps around in the pixel's width: m = 2d for d >= 0, -2d - 1 for d &lt; 0. A block starts with the number
/// k + 1 in 3, 4 or 5 bits (pixels of 1, 2, 4 bytes): 0 when all its m are 0, the largest number when its m stand as they
/// are; else each m is m >> k zeros, a one, and the k low bits of m.
/// </summary>
internal static class RiceCode
{
    /// <summary>Decodes a tile.</summary>
    /// <typeparam name="T">byte, short or int, by BYTEPIX.</typeparam>
    /// <param name="stream">The tile's bytes.</param>
    /// <param name="blockSize">Pixels of a block, BLOCKSIZE.</param>
    /// <param name="pixels">Receives the pixels.</param>
    /// <returns>What is wrong with the stream; null when nothing is.</returns>
    public static string? Decode<T>(ReadOnlySpan<byte> stream, int blockSize, Span<T> pixels)
        where T : unmanaged, IBinaryInteger<T>
    {
        if (stream.Length < Unsafe.SizeOf<T>())
            return "it ends inside its first pixel";
        uint last = First<T>(stream);
        BitReader bits = new(stream[Unsafe.SizeOf<T>()..]);
        for (int start = 0; start < pixels.Length; start += blockSize)
        {
            Span<T> block = pixels.Slice(start, Math.Min(blockSize, pixels.Length - start));
            int k = (int)bits.Take(Code<T>.NumberBits) - 1;
            if (k > Code<T>.Verbatim)
                return $"a block at pixel {start} asks for {k} low bits, at most {Code<T>.Verbatim - 1} are";
            if (k < 0)
                block.Fill(T.CreateTruncating(last));
            else if (k == Code<T>.Verbatim)
                last = DecodeVerbatim(ref bits, block, last);
            else
                last = DecodeRice(ref bits, k, block, last);
            if (bits.IsOverrun)
                return $"it ends inside the block at pixel {start} of {pixels.Length}";
        }

        return null;
    }

    /// <summary>Bytes that a tile of so many pixels can take at most.</summary>
    public static int MostBytes<T>(int pixels, int blockSize)
        where T : unmanaged =>
        checked((int)((((long)(pixels + 1) * 8 * Unsafe.SizeOf<T>()) + (((pixels / blockSize) + 1L) * Code<T>.NumberBits) + 7) / 8) + sizeof(ulong));

    /// <summary>Encodes a tile.</summary>
    /// <typeparam name="T">byte, short or int, by BYTEPIX.</typeparam>
    /// <param name="pixels">The pixels, one or more.</param>
    /// <param name="blockSize">Pixels of a block, BLOCKSIZE.</param>
    /// <param name="stream">Receives the bytes; at least <see cref="MostBytes{T}"/> long.</param>
    /// <returns>Bytes written.</returns>
    public static int Encode<T>(ReadOnlySpan<T> pixels, int blockSize, Span<byte> stream)
        where T : unmanaged, IBinaryInteger<T>
    {
        int size = Unsafe.SizeOf<T>();
        uint last = uint.CreateTruncating(pixels[0]) << (32 - (8 * size));
        for (int i = 0; i < size; i++)
            stream[i] = (byte)(last >> (24 - (8 * i)));
        last >>= 32 - (8 * size);
        BitWriter bits = new(stream[size..]);
        Span<uint> mapped = stackalloc uint[Math.Min(blockSize, 256)];
        if (blockSize > mapped.Length)
            mapped = new uint[blockSize];
        for (int start = 0; start < pixels.Length; start += blockSize)
        {
            ReadOnlySpan<T> block = pixels.Slice(start, Math.Min(blockSize, pixels.Length - start));
            ulong sum = Map(block, mapped, ref last);
            Span<uint> values = mapped[..block.Length];
            int k = LowBits(sum, block.Length);
            if (sum == 0)
                bits.Put(0, Code<T>.NumberBits);
            else if (k >= Code<T>.Verbatim || RiceBits(values, k) >= (ulong)block.Length * (ulong)(8 * size))
                PutVerbatim(ref bits, values, Code<T>.Verbatim + 1, Code<T>.NumberBits, 8 * size);
            else
                PutRice(ref bits, values, k, Code<T>.NumberBits);
        }

        return size + bits.Finish();
    }

    private static uint First<T>(ReadOnlySpan<byte> stream) => Unsafe.SizeOf<T>() switch
    {
        1 => stream[0],
        2 => BinaryPrimitives.ReadUInt16BigEndian(stream),
        _ => BinaryPrimitives.ReadUInt32BigEndian(stream),
    };

    private static uint DecodeVerbatim<T>(ref BitReader bits, Span<T> block, uint last)
        where T : unmanaged, IBinaryInteger<T>
    {
        for (int i = 0; i < block.Length; i++)
        {
            last += Unmap(bits.Take(8 * Unsafe.SizeOf<T>()));
            block[i] = T.CreateTruncating(last);
        }

        return last;
    }

    /// <summary>The reader's fields are kept in locals here: this is where the time goes.</summary>
    private static uint DecodeRice<T>(ref BitReader reader, int k, Span<T> block, uint last)
        where T : unmanaged, IBinaryInteger<T>
    {
        BitReader bits = reader;
        for (int i = 0; i < block.Length; i++)
        {
            bits.Fill();
            int zeros = BitOperations.LeadingZeroCount(bits.Ahead);
            uint mapped;
            if (zeros + 1 + k <= BitReader.FilledBits)
            {
                // The shifts by 1 keep k = 0 from being a shift by 64, which shifts by none.
                ulong behind = bits.Ahead << zeros << 1;
                mapped = ((uint)zeros << k) | (uint)(behind >> 1 >> (63 - k));
                bits.Skip(zeros + 1 + k);
            }
            else
            {
                mapped = (bits.TakeZeros() << k) | bits.Take(k);
            }

            last += Unmap(mapped);
            block[i] = T.CreateTruncating(last);
        }

        reader = bits;
        return last;
    }

    /// <summary>d of m.</summary>
    private static uint Unmap(uint mapped) => (mapped >> 1) ^ (uint)-(int)(mapped & 1);

    /// <summary>The m of a block, and their sum.</summary>
    private static ulong Map<T>(ReadOnlySpan<T> block, Span<uint> mapped, ref uint last)
        where T : unmanaged, IBinaryInteger<T>
    {
        ulong sum = 0;
        int unused = 32 - (8 * Unsafe.SizeOf<T>());
        for (int i = 0; i < block.Length; i++)
        {
            uint pixel = uint.CreateTruncating(block[i]);
            int difference = (int)((pixel - last) << unused) >> unused;
            mapped[i] = (uint)((difference << 1) ^ (difference >> 31));
            sum += mapped[i];
            last = pixel;
        }

        return sum;
    }

    /// <summary>k = floor(log2(mean m)): near the best for m that fall off exponentially, as those of noise do.</summary>
    private static int LowBits(ulong sum, int count) => BitOperations.Log2(Math.Max(1, sum / (ulong)count));

    private static ulong RiceBits(ReadOnlySpan<uint> mapped, int k)
    {
        ulong bits = (ulong)mapped.Length * (ulong)(k + 1);
        foreach (uint m in mapped)
            bits += m >> k;
        return bits;
    }

    private static void PutVerbatim(ref BitWriter bits, scoped ReadOnlySpan<uint> mapped, int number, int numberBits, int width)
    {
        bits.Put((uint)number, numberBits);
        foreach (uint m in mapped)
            bits.Put(m, width);
    }

    private static void PutRice(ref BitWriter writer, scoped ReadOnlySpan<uint> mapped, int k, int numberBits)
    {
        BitWriter bits = writer;
        bits.Put((uint)k + 1, numberBits);
        uint low = (1u << k) - 1;
        foreach (uint m in mapped)
        {
            uint zeros = m >> k;
            if (zeros + 1 + k <= 32)
            {
                bits.Put((1u << k) | (m & low), (int)zeros + 1 + k);
            }
            else
            {
                for (; zeros > 0; zeros -= Math.Min(zeros, 32))
                    bits.Put(0, (int)Math.Min(zeros, 32));
                bits.Put((1u << k) | (m & low), k + 1);
            }
        }

        writer = bits;
    }

    /// <summary>Widths of the code for pixels of 1, 2 and 4 bytes.</summary>
    private static class Code<T>
        where T : unmanaged
    {
        /// <summary>Bits of the number that a block starts with.</summary>
        public static int NumberBits => Unsafe.SizeOf<T>() switch { 1 => 3, 2 => 4, _ => 5 };

        /// <summary>The k that stands for a block whose m stand as they are.</summary>
        public static int Verbatim => Unsafe.SizeOf<T>() switch { 1 => 6, 2 => 14, _ => 25 };
    }

    /// <summary>Bits, the most significant first.</summary>
    private ref struct BitWriter(Span<byte> bytes)
    {
        private readonly Span<byte> bytes = bytes;
        private int next;
        private int bits;
        private ulong held;

        /// <summary>Appends the low bits of a number, up to 32; the others are zeros.</summary>
        [MethodImpl(MethodImplOptions.AggressiveInlining)]
        public void Put(uint number, int count)
        {
            held |= (ulong)number << (64 - bits - count);
            bits += count;
            if (bits >= 32)
            {
                BinaryPrimitives.WriteUInt32BigEndian(bytes[next..], (uint)(held >> 32));
                held <<= 32;
                next += 4;
                bits -= 32;
            }
        }

        /// <summary>Fills the last byte with zeros; returns the bytes written.</summary>
        public int Finish()
        {
            for (; bits > 0; bits -= 8)
            {
                bytes[next++] = (byte)(held >> 56);
                held <<= 8;
            }

            return next;
        }
    }
}
