using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Noise;

/// <summary>
/// The sample of a given rank among many, exactly and without sorting. A sorted few of them give two fences that very
/// likely hold the rank between them (Floyd &amp; Rivest, Communications of the ACM 18 (1975) 165); samples at and beyond the
/// fences are counted by vectors, those between them by leading 16-bit digits of order-preserving keys, then by the next
/// digits among those that share them (radix selection; Knuth, The Art of Computer Programming 3, 5.2.5).
/// </summary>
public static class RankSelection
{
    /// <summary>Length of the table of counts that every call needs.</summary>
    public const int Counts = 1 << 16;

    private const int Few = 2048;

    /// <summary>
    /// Median of the samples whose flags have none of some bits: the middle rank, or the mean of the two middle ones;
    /// NaN when there is none.
    /// </summary>
    /// <param name="samples">ushort, short, float or double; no NaN among those that count.</param>
    /// <param name="flags">A flag for each sample; empty when all count.</param>
    /// <param name="without">Samples with any of these flags do not count.</param>
    /// <param name="counts">Scratch of <see cref="Counts"/>.</param>
    public static double Median<T>(ReadOnlySpan<T> samples, ReadOnlySpan<SampleFlags> flags, SampleFlags without, Span<int> counts)
        where T : unmanaged, INumber<T>
    {
        long valid = Valid(samples.Length, flags, without);
        if (valid == 0)
            return double.NaN;
        RankedSample<T> lower = Select(samples, flags, without, (valid - 1) / 2, counts);
        double low = double.CreateTruncating(lower.Value);
        if (valid % 2 != 0 || valid / 2 < lower.Below + lower.Equal)
            return low;
        double high = double.CreateTruncating(Select(samples, flags, without, valid / 2, counts).Value);
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
        (T low, T high) = Fences(samples, flags, without, (double)rank / Valid(samples.Length, flags, without));
        Span<int> table = counts[..Counts];
        int bits = Unsafe.SizeOf<T>() * 8;
        ulong prefix = 0;
        long below = 0;
        for (int shift = bits - 16; ; shift -= 16)
        {
            table.Clear();
            ulong known = shift + 16 >= bits ? 0 : ulong.MaxValue << (shift + 16);
            Around around = Count(samples, flags, without, low, high, table, shift, known, prefix);
            if (known == 0)
            {
                if (rank < around.Below || rank >= around.Below + around.AtLow + around.Between + around.AtHigh)
                {
                    // The few were not like the rest. Fences at the ends hold every rank.
                    (low, high) = Ends<T>();
                    shift += 16;
                    continue;
                }

                if (rank < around.Below + around.AtLow)
                    return new RankedSample<T>(low, around.Below, around.AtLow);
                if (rank >= around.Below + around.AtLow + around.Between)
                    return new RankedSample<T>(high, around.Below + around.AtLow + around.Between, around.AtHigh);
                below = around.Below + around.AtLow;
            }

            int digit = 0;
            for (int many = Sum(table, 0); below + many <= rank; many = Sum(table, digit))
            {
                below += many;
                digit += Vector512<int>.Count;
            }

            while (below + table[digit] <= rank)
                below += table[digit++];
            prefix |= (ulong)digit << shift;
            if (shift == 0)
                return new RankedSample<T>(SampleKeys.ToSample<T>(prefix), below, table[digit]);
        }
    }

    /// <summary>The next other value below or above a ranked sample, and its place.</summary>
    /// <param name="samples">All samples; not NaN.</param>
    /// <param name="at">One of them; it is not the last on that side.</param>
    /// <param name="isBelow">The next below, else the next above.</param>
    public static RankedSample<double> Neighbour(ReadOnlySpan<double> samples, RankedSample<double> at, bool isBelow)
    {
        // Negated, the next below is the next above.
        Vector512<double> sign = Vector512.Create(isBelow ? -1.0 : 1.0), nearest = Vector512.Create(double.PositiveInfinity);
        Vector512<double> values = Vector512.Create(at.Value) * sign;
        ReadOnlySpan<Vector512<double>> vectors = MemoryMarshal.Cast<double, Vector512<double>>(samples);
        foreach (Vector512<double> vector in vectors)
        {
            Vector512<double> signed = vector * sign;
            nearest = Vector512.Min(nearest, Vector512.ConditionalSelect(Vector512.GreaterThan(signed, values), signed, nearest));
        }

        double next = double.PositiveInfinity;
        for (int lane = 0; lane < Vector512<double>.Count; lane++)
            next = Math.Min(next, nearest[lane]);
        foreach (double sample in samples[(vectors.Length * Vector512<double>.Count)..])
            next = sample * sign[0] > values[0] ? Math.Min(next, sample * sign[0]) : next;
        double value = next * sign[0];
        int equal = samples.Count(value);
        return new RankedSample<double>(value, isBelow ? at.Below - equal : at.Below + at.Equal, equal);
    }

    /// <summary>Two samples that very likely have a share of all samples between them: three standard errors to each side.</summary>
    private static (T Low, T High) Fences<T>(ReadOnlySpan<T> samples, ReadOnlySpan<SampleFlags> flags, SampleFlags without, double share)
        where T : unmanaged, INumber<T>
    {
        if (samples.Length < 4 * Few)
            return Ends<T>();
        Span<T> few = stackalloc T[Few];
        int count = 0, stride = (samples.Length / Few) | 1;
        for (int i = 0; i < samples.Length && count < Few; i += stride)
        {
            if (flags.IsEmpty || (flags[i] & without) == 0)
                few[count++] = samples[i];
        }

        few = few[..count];
        few.Sort();
        double place = share * count, error = 3 * Math.Sqrt(count * share * (1 - share));
        int first = (int)(place - error) - 1, last = (int)(place + error) + 1;
        (T low, T high) = Ends<T>();
        return (first >= 0 && first < count ? few[first] : low, last < count ? few[last] : high);
    }

    /// <summary>Fences that no sample is beyond.</summary>
    private static (T Low, T High) Ends<T>()
        where T : unmanaged, INumber<T> => (T.CreateSaturating(double.NegativeInfinity), T.CreateSaturating(double.PositiveInfinity));

    /// <summary>
    /// Counts the samples around the fences, and in the table the digits at a shift of those between them whose known
    /// digits are the prefix.
    /// </summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static Around Count<T>(
        ReadOnlySpan<T> samples, ReadOnlySpan<SampleFlags> flags, SampleFlags without, T low, T high, Span<int> table, int shift, ulong known, ulong prefix)
        where T : unmanaged, INumber<T>
    {
        Around around = default;
        Vector512<T> lows = Vector512.Create(low), highs = Vector512.Create(high);
        int i = 0;
        for (; i <= samples.Length - Vector512<T>.Count; i += Vector512<T>.Count)
        {
            if (!flags.IsEmpty && Valid(Vector512<T>.Count, flags.Slice(i, Vector512<T>.Count), without) < Vector512<T>.Count)
            {
                for (int k = i; k < i + Vector512<T>.Count; k++)
                    CountOne(samples[k], flags[k], ref around, table);
                continue;
            }

            Vector512<T> vector = Vector512.Create(samples.Slice(i, Vector512<T>.Count));
            around.Below += BitOperations.PopCount(Vector512.LessThan(vector, lows).ExtractMostSignificantBits());
            around.AtLow += BitOperations.PopCount(Vector512.Equals(vector, lows).ExtractMostSignificantBits());
            around.AtHigh += BitOperations.PopCount(Vector512.Equals(vector, highs).ExtractMostSignificantBits());
            ulong between = (Vector512.GreaterThan(vector, lows) & Vector512.LessThan(vector, highs)).ExtractMostSignificantBits();
            around.Between += BitOperations.PopCount(between);
            for (; between != 0; between &= between - 1)
                CountDigit(samples[i + BitOperations.TrailingZeroCount(between)], table);
        }

        for (; i < samples.Length; i++)
            CountOne(samples[i], flags.IsEmpty ? SampleFlags.None : flags[i], ref around, table);
        if (low == high)
            around.AtHigh = 0;
        return around;

        void CountOne(T sample, SampleFlags flag, ref Around around, Span<int> table)
        {
            if ((flag & without) != 0)
                return;
            around.Below += sample < low ? 1 : 0;
            around.AtLow += sample == low ? 1 : 0;
            around.AtHigh += sample == high ? 1 : 0;
            if (sample > low && sample < high)
            {
                around.Between++;
                CountDigit(sample, table);
            }
        }

        void CountDigit(T sample, Span<int> table)
        {
            ulong key = SampleKeys.Of(sample + T.Zero); // both zeros have one key
            if ((key & known) == prefix)
                table[(ushort)(key >> shift)]++;
        }
    }

    /// <summary>Sum of a vector's worth of counts.</summary>
    private static int Sum(ReadOnlySpan<int> table, int digit) => Vector512.Sum(Vector512.Create(table.Slice(digit, Vector512<int>.Count)));

    /// <summary>How many samples count.</summary>
    private static int Valid(int samples, ReadOnlySpan<SampleFlags> flags, SampleFlags without)
    {
        if (flags.IsEmpty)
            return samples;
        ReadOnlySpan<byte> bytes = MemoryMarshal.AsBytes(flags);
        int valid = 0, i = 0;
        for (; i <= bytes.Length - Vector256<byte>.Count; i += Vector256<byte>.Count)
        {
            Vector256<byte> masked = Vector256.Create(bytes.Slice(i, Vector256<byte>.Count)) & Vector256.Create((byte)without);
            valid += BitOperations.PopCount(Vector256.Equals(masked, Vector256<byte>.Zero).ExtractMostSignificantBits());
        }

        for (; i < bytes.Length; i++)
            valid += (bytes[i] & (byte)without) == 0 ? 1 : 0;
        return valid;
    }
}

/// <summary>Samples below two fences, at the lower, between them, and at the higher; those at both count at the lower.</summary>
internal record struct Around(long Below, long AtLow, long Between, long AtHigh);

/// <summary>A sample and its place among the others.</summary>
/// <typeparam name="T">Sample type.</typeparam>
/// <param name="Value">The sample.</param>
/// <param name="Below">Samples less than it.</param>
/// <param name="Equal">Samples equal to it, itself included.</param>
public readonly record struct RankedSample<T>(T Value, long Below, long Equal)
    where T : unmanaged;
