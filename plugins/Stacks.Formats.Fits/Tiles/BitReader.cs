using System.Buffers.Binary;
using System.Numerics;
using System.Runtime.CompilerServices;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>Bits, the most significant first. Behind the end of the bytes come zeros, and the reader knows.</summary>
internal ref struct BitReader(ReadOnlySpan<byte> bytes)
{
    /// <summary>Bits that are there at least after <see cref="Fill"/>.</summary>
    public const int FilledBits = 56;

    private readonly ReadOnlySpan<byte> bytes = bytes;
    private int next;
    private int bits;

    /// <summary>The next bits, from the top.</summary>
    public ulong Ahead { get; private set; }

    /// <summary>True when more bits were taken than there are.</summary>
    public readonly bool IsOverrun => ((long)next * 8) - bits > (long)bytes.Length * 8;

    /// <summary>Makes <see cref="FilledBits"/> or more bits be ahead.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public void Fill()
    {
        if (bits >= FilledBits)
            return;
        if (next <= bytes.Length - sizeof(ulong))
        {
            Ahead |= BinaryPrimitives.ReadUInt64BigEndian(bytes[next..]) >> bits;
            next += (63 - bits) >> 3;
            bits |= FilledBits;
            return;
        }

        for (; bits < FilledBits; bits += 8, next++)
        {
            if (next < bytes.Length)
                Ahead |= (ulong)bytes[next] << (56 - bits);
        }
    }

    /// <summary>Takes bits, no more than are ahead.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public void Skip(int count)
    {
        Ahead <<= count;
        bits -= count;
    }

    /// <summary>The next bits, up to 32, as a number.</summary>
    public uint Take(int count)
    {
        Fill();
        uint taken = (uint)(Ahead >> 1 >> (63 - count));
        Skip(count);
        return taken;
    }

    /// <summary>Takes what is left of a byte of which bits were taken.</summary>
    public void SkipToByte() => Skip(bits & 7);

    /// <summary>Counts zeros and takes them and the one behind them.</summary>
    public uint TakeZeros()
    {
        uint zeros = 0;
        while (!IsOverrun)
        {
            Fill();
            int run = Math.Min(BitOperations.LeadingZeroCount(Ahead), FilledBits);
            zeros += (uint)run;
            if (run < FilledBits)
            {
                Skip(run + 1);
                break;
            }

            Skip(run);
        }

        return zeros;
    }
}
