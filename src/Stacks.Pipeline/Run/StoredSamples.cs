using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Pipeline;

/// <summary>What can be done with the stored bytes of a frame, for one <see cref="SampleType"/>.</summary>
internal abstract class StoredSamples
{
    /// <summary>The operations for a sample type.</summary>
    public static StoredSamples Of(SampleType type) => type switch
    {
        SampleType.UInt8 => StoredSamples<byte>.Instance,
        SampleType.Int8 => StoredSamples<sbyte>.Instance,
        SampleType.UInt16 => StoredSamples<ushort>.Instance,
        SampleType.Int16 => StoredSamples<short>.Instance,
        SampleType.UInt32 => StoredSamples<uint>.Instance,
        SampleType.Int32 => StoredSamples<int>.Instance,
        SampleType.UInt64 => StoredSamples<ulong>.Instance,
        SampleType.Int64 => StoredSamples<long>.Instance,
        SampleType.Float16 => StoredSamples<Half>.Instance,
        SampleType.Float32 => StoredSamples<float>.Instance,
        _ => StoredSamples<double>.Instance,
    };

    /// <summary>
    /// Adds Missing (NaN, infinite, BLANK) and Saturated (the layout's saturation or brighter: at or above it in stored
    /// units, at or below it where the scale is negative) to the flags.
    /// </summary>
    public abstract void Mark(ReadOnlySpan<byte> stored, FrameLayout layout, Span<SampleFlags> flags);

    /// <summary>A sum and that of the samples that are not missing, rows of <paramref name="width"/> in order.</summary>
    public abstract SampleSum Sum(SampleSum sum, ReadOnlySpan<byte> stored, ReadOnlySpan<SampleFlags> flags, int width);

    /// <summary>values = zero + scale * stored; a 64-bit integer is rounded to the nearest double.</summary>
    public abstract void Load<T>(ReadOnlySpan<byte> stored, ValueTransform transform, Span<T> values)
        where T : unmanaged, INumber<T>;

    /// <summary>
    /// stored = (value - zero) / scale, integers rounded half to even; a result beyond the type's ends is held there.
    /// </summary>
    /// <returns>True when a finite value had to be held.</returns>
    public abstract bool Store<T>(ReadOnlySpan<T> values, ValueTransform transform, Span<byte> stored)
        where T : unmanaged, INumber<T>;

    /// <summary><see cref="Store"/> for the samples alone whose decision is Replaced; all others keep their bits.</summary>
    /// <returns>True when a finite value had to be held.</returns>
    public abstract bool Patch<T>(
        ReadOnlySpan<T> values, ReadOnlySpan<SampleFlags> decisions, ValueTransform transform, Span<byte> stored)
        where T : unmanaged, INumber<T>;

    /// <summary>Copies the stored bits of samples that have any of some flags and none of others.</summary>
    public abstract void Keep(
        ReadOnlySpan<byte> source, ReadOnlySpan<SampleFlags> flags, SampleFlags any, SampleFlags none, Span<byte> result);

    /// <summary>Writes NaN where a sample is missing and not infinite; floating-point types only.</summary>
    public abstract void Void(ReadOnlySpan<SampleFlags> flags, Span<byte> result);
}

/// <summary>The operations for samples stored as <typeparamref name="TStored"/>.</summary>
internal sealed class StoredSamples<TStored> : StoredSamples
    where TStored : unmanaged, INumber<TStored>, IMinMaxValue<TStored>
{
    private static readonly bool IsInteger = TStored.One / (TStored.One + TStored.One) == TStored.Zero;
    private static readonly double Lowest = double.CreateSaturating(TStored.MinValue);
    private static readonly double Highest = double.CreateSaturating(TStored.MaxValue);

    public static StoredSamples<TStored> Instance { get; } = new();

    public override void Mark(ReadOnlySpan<byte> stored, FrameLayout layout, Span<SampleFlags> flags)
    {
        ReadOnlySpan<TStored> samples = MemoryMarshal.Cast<byte, TStored>(stored);
        bool hasBlank = IsInteger && layout.Blank is { } b && Int128.CreateSaturating(TStored.CreateSaturating(b)) == b;
        TStored blank = hasBlank ? TStored.CreateSaturating(layout.Blank!.Value) : default;
        double end = layout.SaturationStored ?? double.NaN;
        bool upward = layout.Transform.Scale > 0;
        bool hasEnd = upward ? end <= Highest : end >= Lowest;
        TStored least = hasEnd && upward ? TStored.CreateSaturating(IsInteger ? Math.Ceiling(end) : end) : TStored.MinValue;
        TStored most = hasEnd && !upward ? TStored.CreateSaturating(IsInteger ? Math.Floor(end) : end) : TStored.MaxValue;
        if (IsInteger && !hasBlank && !hasEnd)
            return;
        for (int i = NextToMark(samples, 0, hasBlank, blank, hasEnd, least, most); i < samples.Length; i = NextToMark(samples, i + 1, hasBlank, blank, hasEnd, least, most))
        {
            TStored sample = samples[i];
            if (!TStored.IsFinite(sample) || (hasBlank && sample == blank))
                flags[i] |= SampleFlags.Missing;
            else if (hasEnd && sample >= least && sample <= most && (flags[i] & SampleFlags.Missing) == 0)
                flags[i] |= SampleFlags.Saturated;
        }
    }

    /// <summary>The first sample from a place on that may be not finite, BLANK or saturated: vectors without any are passed over.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static int NextToMark(ReadOnlySpan<TStored> samples, int start, bool hasBlank, TStored blank, bool hasEnd, TStored least, TStored most)
    {
        if (!Vector<TStored>.IsSupported)
            return start;
        Vector<TStored> blanks = new(blank), leasts = new(least), mosts = new(most), lowests = new(TStored.MinValue), highests = new(TStored.MaxValue);
        while (start <= samples.Length - Vector<TStored>.Count)
        {
            Vector<TStored> vector = new(samples[start..]);
            bool isPlain = (IsInteger || (Vector.LessThanOrEqualAll(vector, highests) && Vector.GreaterThanOrEqualAll(vector, lowests)))
                && !(hasBlank && Vector.EqualsAny(vector, blanks))
                && !(hasEnd && (Vector.GreaterThanOrEqual(vector, leasts) & Vector.LessThanOrEqual(vector, mosts)) != Vector<TStored>.Zero);
            if (!isPlain)
                break;
            start += Vector<TStored>.Count;
        }

        return start;
    }

    public override SampleSum Sum(SampleSum sum, ReadOnlySpan<byte> stored, ReadOnlySpan<SampleFlags> flags, int width)
    {
        ReadOnlySpan<TStored> samples = MemoryMarshal.Cast<byte, TStored>(stored);
        for (int start = 0; start < samples.Length; start += width)
        {
            ReadOnlySpan<TStored> row = samples.Slice(start, width);
            ReadOnlySpan<SampleFlags> rowFlags = flags.Slice(start, width);
            sum = typeof(TStored) == typeof(long) || typeof(TStored) == typeof(ulong) ? sum.Add(SumRow<Int128>(row, rowFlags, out int count), 0, count)
                : typeof(TStored) == typeof(ushort) && !FlagSearch.Any(rowFlags, SampleFlags.Missing) ? sum.Add(SumWhole(MemoryMarshal.Cast<TStored, ushort>(row)), 0, width)
                : IsInteger ? sum.Add(SumRow<long>(row, rowFlags, out count), 0, count)
                : sum.Add(0, SumRow<double>(row, rowFlags, out count), count);
        }

        return sum;
    }

    /// <summary>The sum of a row of which no sample is missing.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static long SumWhole(ReadOnlySpan<ushort> row)
    {
        const int longest = 1 << 16; // samples, of which each of a vector's 32-bit sums takes at most an eighth
        long sum = 0;
        for (; row.Length > 0; row = row[Math.Min(row.Length, longest)..])
        {
            ReadOnlySpan<ushort> part = row[..Math.Min(row.Length, longest)];
            ReadOnlySpan<Vector<ushort>> vectors = MemoryMarshal.Cast<ushort, Vector<ushort>>(part);
            Vector<uint> sums = Vector<uint>.Zero;
            foreach (Vector<ushort> vector in vectors)
                sums += Vector.WidenLower(vector) + Vector.WidenUpper(vector);
            Vector.Widen(sums, out Vector<ulong> lower, out Vector<ulong> upper);
            sum += (long)Vector.Sum(lower + upper);
            foreach (ushort sample in part[(vectors.Length * Vector<ushort>.Count)..])
                sum += sample;
        }

        return sum;
    }

    private static TSum SumRow<TSum>(ReadOnlySpan<TStored> row, ReadOnlySpan<SampleFlags> flags, out int count)
        where TSum : INumber<TSum>
    {
        TSum sum = TSum.Zero;
        count = 0;
        for (int x = 0; x < row.Length; x++)
        {
            if ((flags[x] & SampleFlags.Missing) != 0)
                continue;
            sum += TSum.CreateTruncating(row[x]);
            count++;
        }

        return sum;
    }

    public override void Load<T>(ReadOnlySpan<byte> stored, ValueTransform transform, Span<T> values)
    {
        ReadOnlySpan<TStored> samples = MemoryMarshal.Cast<byte, TStored>(stored);
        if (!transform.IsIdentity)
        {
            for (int i = 0; i < samples.Length; i++)
                values[i] = T.CreateTruncating(transform.ToValue(double.CreateTruncating(samples[i])));
        }
        else if (typeof(T) == typeof(TStored))
        {
            MemoryMarshal.Cast<byte, T>(stored).CopyTo(values);
        }
        else
        {
            for (int i = 0; i < samples.Length; i++)
                values[i] = T.CreateTruncating(samples[i]);
        }
    }

    public override bool Store<T>(ReadOnlySpan<T> values, ValueTransform transform, Span<byte> stored)
    {
        Span<TStored> samples = MemoryMarshal.Cast<byte, TStored>(stored);
        if (typeof(T) == typeof(TStored) && transform.IsIdentity)
        {
            MemoryMarshal.AsBytes(values).CopyTo(stored);
            return false;
        }

        bool held = false;
        for (int i = 0; i < values.Length; i++)
            samples[i] = ToStored(transform.ToStored(double.CreateTruncating(values[i])), ref held);
        return held;
    }

    public override bool Patch<T>(
        ReadOnlySpan<T> values, ReadOnlySpan<SampleFlags> decisions, ValueTransform transform, Span<byte> stored)
    {
        Span<TStored> samples = MemoryMarshal.Cast<byte, TStored>(stored);
        bool held = false;
        for (int i = FlagScan.NextDecision(decisions, 0); i >= 0; i = FlagScan.NextDecision(decisions, i + 1))
        {
            if ((decisions[i] & SampleFlags.Replaced) != 0)
                samples[i] = ToStored(transform.ToStored(double.CreateTruncating(values[i])), ref held);
        }

        return held;
    }

    public override void Keep(
        ReadOnlySpan<byte> source, ReadOnlySpan<SampleFlags> flags, SampleFlags any, SampleFlags none, Span<byte> result)
    {
        ReadOnlySpan<TStored> from = MemoryMarshal.Cast<byte, TStored>(source);
        Span<TStored> to = MemoryMarshal.Cast<byte, TStored>(result);
        for (int i = 0; i < flags.Length; i++)
        {
            if ((flags[i] & any) != 0 && (flags[i] & none) == 0)
                to[i] = from[i];
        }
    }

    public override void Void(ReadOnlySpan<SampleFlags> flags, Span<byte> result)
    {
        Span<TStored> samples = MemoryMarshal.Cast<byte, TStored>(result);
        TStored nan = TStored.CreateSaturating(double.NaN);
        for (int i = 0; i < flags.Length; i++)
        {
            if ((flags[i] & SampleFlags.Missing) != 0 && !TStored.IsInfinity(samples[i]))
                samples[i] = nan;
        }
    }

    private static TStored ToStored(double value, ref bool held)
    {
        double rounded = IsInteger ? Math.Round(value, MidpointRounding.ToEven) : value;
        if (double.IsFinite(rounded) && (rounded < Lowest || rounded > Highest))
        {
            held = true;
            return rounded < Lowest ? TStored.MinValue : TStored.MaxValue;
        }

        return TStored.CreateSaturating(rounded);
    }
}

/// <summary>A sum of stored samples: exact for integers, in double precision with compensated rows for floats.</summary>
/// <param name="Whole">Sum of integer samples.</param>
/// <param name="Real">Sum of floating-point samples.</param>
/// <param name="Lost">Rounding error of <paramref name="Real"/>, carried (Neumaier, ZAMM 54 (1974) 39).</param>
/// <param name="Count">Samples in the sum.</param>
internal readonly record struct SampleSum(Int128 Whole, double Real, double Lost, long Count)
{
    /// <summary>The sum with a row more.</summary>
    public SampleSum Add(Int128 whole, double real, int count)
    {
        double sum = Real + real;
        double lost = Math.Abs(Real) >= Math.Abs(real) ? Real - sum + real : real - sum + Real;
        return new SampleSum(Whole + whole, sum, Lost + lost, Count + count);
    }

    /// <summary>The sum in value units: zero * count + scale * sum.</summary>
    public double Value(ValueTransform transform) =>
        (transform.Zero * Count) + (transform.Scale * ((double)Whole + (Real + Lost)));

    /// <summary>This sum less another of samples of the same type and transform, in value units.</summary>
    public double Less(SampleSum other, ValueTransform transform) =>
        transform.Scale * ((double)(Whole - other.Whole) + (Real - other.Real + (Lost - other.Lost)));
}
