using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Noise;

/// <summary>
/// The sample of a given rank among many, exactly and without sorting: by counting leading 16-bit digits of
/// order-preserving keys, then the next digits among the samples that share them (radix selection; Knuth, The Art of
/// Computer Programming 3, 5.2.5).
/// </summary>
public static class RankSelection
{
    /// <summary>Length of the table of counts that every call needs.</summary>
    public const int Counts = 1 << 16;

    /// <summary>
    /// Median of the samples whose flags have none of some bits: the middle rank, or the mean of the two middle ones;
    /// NaN when there is none.
    /// </summary>
    /// <param name="samples">ushort, short, float or double; no NaN among those that count.</param>
    /// <param name="flags">A flag for each sample.</param>
    /// <param name="without">Samples with any of these flags do not count.</param>
    /// <param name="counts">Scratch of <see cref="Counts"/>.</param>
    public static double Median<T>(ReadOnlySpan<T> samples, ReadOnlySpan<SampleFlags> flags, SampleFlags without, Span<int> counts)
        where T : unmanaged, INumber<T>
    {
        long valid = 0;
        foreach (SampleFlags flag in flags)
            valid += (flag & without) == 0 ? 1 : 0;
        if (valid == 0)
            return double.NaN;
        RankedSample<T> lower = Select(samples, flags, without, (valid - 1) / 2, counts);
        double low = double.CreateTruncating(lower.Value);
        if (valid % 2 != 0 || valid / 2 < lower.Below + lower.Equal)
            return low;
        double high = double.PositiveInfinity;
        for (int i = 0; i < samples.Length; i++)
        {
            if ((flags[i] & without) == 0 && samples[i] > lower.Value)
                high = Math.Min(high, double.CreateTruncating(samples[i]));
        }

        return low + ((high - low) / 2);
    }

    /// <summary>The sample of a rank, counted from 0 in ascending order.</summary>
    /// <param name="samples">ushort, short, float or double; no NaN among those that count.</param>
    /// <param name="flags">A flag for each sample; empty when all count.</param>
    /// <param name="without">Samples with any of these flags do not count.</param>
    /// <param name="rank">From 0 to the number of samples that count, less 1.</param>
    /// <param name="counts">Scratch of <see cref="Counts"/>.</param>
    public static RankedSample<T> Select<T>(
        ReadOnlySpan<T> samples, ReadOnlySpan<SampleFlags> flags, SampleFlags without, long rank, Span<int> counts)
        where T : unmanaged, INumber<T>
    {
        int bits = Unsafe.SizeOf<T>() * 8;
        ulong prefix = 0;
        long below = 0;
        for (int shift = bits - 16; ; shift -= 16)
        {
            Span<int> table = counts[..Counts];
            table.Clear();
            ulong known = shift + 16 >= bits ? 0 : ulong.MaxValue << (shift + 16);
            for (int i = 0; i < samples.Length; i++)
            {
                ulong key = Key(samples[i]);
                if ((key & known) == prefix && (flags.IsEmpty || (flags[i] & without) == 0))
                    table[(ushort)(key >> shift)]++;
            }

            int digit = 0;
            while (below + table[digit] <= rank)
                below += table[digit++];
            prefix |= (ulong)digit << shift;
            if (shift == 0)
                return new RankedSample<T>(Value<T>(prefix), below, table[digit]);
        }
    }

    /// <summary>An unsigned number that orders as the sample does; both zeros have one key.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private static ulong Key<T>(T sample)
        where T : unmanaged, INumber<T>
    {
        if (typeof(T) == typeof(ushort))
            return Unsafe.BitCast<T, ushort>(sample);
        if (typeof(T) == typeof(short))
            return (ushort)(Unsafe.BitCast<T, short>(sample) ^ short.MinValue);
        if (typeof(T) == typeof(float))
        {
            int whole = Unsafe.BitCast<T, int>(sample + T.Zero);
            return (uint)(whole ^ ((whole >> 31) | int.MinValue));
        }

        long wide = Unsafe.BitCast<T, long>(sample + T.Zero);
        return (ulong)(wide ^ ((wide >> 63) | long.MinValue));
    }

    private static T Value<T>(ulong key)
        where T : unmanaged, INumber<T>
    {
        if (typeof(T) == typeof(ushort))
            return Unsafe.BitCast<ushort, T>((ushort)key);
        if (typeof(T) == typeof(short))
            return Unsafe.BitCast<short, T>((short)((ushort)key ^ 0x8000));
        if (typeof(T) == typeof(float))
        {
            int whole = (int)(uint)key;
            return Unsafe.BitCast<int, T>(whole < 0 ? whole ^ int.MinValue : ~whole);
        }

        long wide = (long)key;
        return Unsafe.BitCast<long, T>(wide < 0 ? wide ^ long.MinValue : ~wide);
    }
}

/// <summary>A sample and its place among the others.</summary>
/// <typeparam name="T">Sample type.</typeparam>
/// <param name="Value">The sample.</param>
/// <param name="Below">Samples less than it.</param>
/// <param name="Equal">Samples equal to it, itself included.</param>
public readonly record struct RankedSample<T>(T Value, long Below, long Equal)
    where T : unmanaged;
