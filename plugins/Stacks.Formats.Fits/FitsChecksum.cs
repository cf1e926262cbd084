using System.Buffers.Binary;
using System.Globalization;
using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;

namespace Stacks.Formats.Fits;

/// <summary>The one's-complement sums of DATASUM and CHECKSUM (Standard 4.0, section 4.4.2.7 and appendix J).</summary>
internal static class FitsChecksum
{
    /// <summary>
    /// The sum over big-endian 32-bit words; bytes after the last whole word are taken as if zeros followed. Lanes of 64
    /// bits take the carries of 2^32 words; these come round at the end.
    /// </summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    public static uint Sum(ReadOnlySpan<byte> bytes)
    {
        ReadOnlySpan<Vector<ushort>> vectors = MemoryMarshal.Cast<byte, Vector<ushort>>(bytes);
        Vector<ulong> even = Vector<ulong>.Zero, odd = Vector<ulong>.Zero, low = new(uint.MaxValue);
        foreach (Vector<ushort> vector in vectors)
        {
            Vector<uint> halves = Vector.AsVectorUInt32((vector << 8) | (vector >>> 8));
            Vector<ulong> words = Vector.AsVectorUInt64((halves << 16) | (halves >>> 16));
            even += words & low;
            odd += words >>> 32;
        }

        ulong sum = 0;
        for (int lane = 0; lane < Vector<ulong>.Count; lane++)
            sum = Add(Add(sum, even[lane]), odd[lane]);
        Span<byte> word = stackalloc byte[sizeof(uint)];
        for (ReadOnlySpan<byte> rest = bytes[(vectors.Length * Vector<byte>.Count)..]; rest.Length > 0; rest = rest[Math.Min(rest.Length, word.Length)..])
        {
            word.Clear();
            rest[..Math.Min(rest.Length, word.Length)].CopyTo(word);
            sum = Add(sum, BinaryPrimitives.ReadUInt32BigEndian(word));
        }

        return Add((uint)sum, (uint)(sum >> 32));
    }

    /// <summary>One's-complement addition: the carry comes round.</summary>
    public static uint Add(uint a, uint b)
    {
        ulong sum = (ulong)a + b;
        return (uint)sum + (uint)(sum >> 32);
    }

    private static ulong Add(ulong a, ulong b)
    {
        ulong sum = a + b;
        return sum < a ? sum + 1 : sum;
    }

    /// <summary>Adds the sum of a part that starts at <paramref name="offset"/> of the whole.</summary>
    public static uint AddPart(uint whole, uint part, long offset) => Add(whole, BitOperations.RotateRight(part, 8 * (int)(offset % 4)));

    /// <summary>
    /// The 16 characters of CHECKSUM: each byte of the value as the sum of four letters or digits, and the whole turned
    /// right by one place so that it falls on words in the card.
    /// </summary>
    /// <param name="value">The complement of the HDU's sum with CHECKSUM set to sixteen '0'.</param>
    public static string Encode(uint value)
    {
        Span<char> text = stackalloc char[16];
        for (int place = 0; place < 4; place++)
        {
            int octet = (int)(value >> (24 - (8 * place))) & 0xFF;
            Span<int> letters = [(octet / 4) + (octet % 4) + '0', (octet / 4) + '0', (octet / 4) + '0', (octet / 4) + '0'];
            bool changed = true;
            while (changed)
            {
                changed = false;
                for (int pair = 0; pair < 4; pair += 2)
                {
                    if (IsPunctuation(letters[pair]) || IsPunctuation(letters[pair + 1]))
                    {
                        letters[pair]++;
                        letters[pair + 1]--;
                        changed = true;
                    }
                }
            }

            for (int i = 0; i < 4; i++)
                text[((4 * i) + place + 1) % 16] = (char)letters[i];
        }

        return new string(text);
    }

    /// <summary>DATASUM as written: an unsigned decimal number in a string.</summary>
    public static string Text(uint sum) => sum.ToString(CultureInfo.InvariantCulture);

    /// <summary>ASCII between the digits and the letters.</summary>
    private static bool IsPunctuation(int c) => c is (>= 0x3A and <= 0x40) or (>= 0x5B and <= 0x60);
}
