using System.Numerics;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>
/// Finds the pixels that the rules of <see cref="ImpulseSearch{T}"/> certainly leave alone, many at once and in single
/// precision: those whose first trusted window is 3 or 5 and clears them. Every comparison keeps a margin of 1e-4, far
/// beyond its rounding, so that what is in doubt is left to the exact rules. In doubt are values of 64 bits, and those whose
/// squares single precision does not hold with its full digits.
/// </summary>
internal sealed class ClearPixels<T>(ImpulseRules rules, NoiseModel noise, IScratch scratch)
    where T : unmanaged, INumber<T>
{
    /// <summary>Pixels of an answer.</summary>
    public const int Answer = 64;

    private const int MostPixels = 512 + Answer, MostAnswers = MostPixels / Answer;
    private const float Margin = 1e-4f, RangeMargin = 1e-6f;
    private const float LeastSquare = 1e-36f, MostSquare = 1e37f;

    private readonly float[] values = Rent<float>(scratch, MostPixels), medians = Rent<float>(scratch, MostPixels);
    private readonly float[] lower = Rent<float>(scratch, MostPixels), upper = Rent<float>(scratch, MostPixels);
    private readonly float[] variances = Rent<float>(scratch, MostPixels);
    private readonly ulong[] trusted = Rent<ulong>(scratch, MostAnswers), untrusted = Rent<ulong>(scratch, MostAnswers);
    private readonly ulong[] clean = Rent<ulong>(scratch, MostAnswers), open = Rent<ulong>(scratch, MostAnswers);
    private readonly ulong[] clear = Rent<ulong>(scratch, MostAnswers);

    /// <summary>Bytes rented.</summary>
    public static long ScratchBytes => (5L * MostPixels * sizeof(float)) + (5L * MostAnswers * sizeof(ulong));

    /// <summary>Finds them in a row of a block.</summary>
    /// <param name="windows">The block.</param>
    /// <param name="row">Its row.</param>
    /// <param name="samples">The samples there.</param>
    /// <returns>A bit for each pixel, lowest first, 64 a number: 1 where it is left alone.</returns>
    public ReadOnlySpan<ulong> Find(QuartileWindows<T> windows, int row, ReadOnlySpan<T> samples)
    {
        int answers = (samples.Length + Answer - 1) / Answer;
        clear.AsSpan(0, answers).Clear();
        if (typeof(T) == typeof(double))
            return clear.AsSpan(0, answers);
        Singles.From(samples, values);
        Judge(windows, 0, row, answers);
        for (int i = 0; i < answers; i++)
            clear[i] = trusted[i] & clean[i];
        if (windows.Count == 1)
            return clear.AsSpan(0, answers);

        // Where trust in the first is in doubt, both have to be content.
        for (int i = 0; i < answers; i++)
            open[i] = untrusted[i] | clean[i];
        Judge(windows, 1, row, answers);
        for (int i = 0; i < answers; i++)
            clear[i] |= trusted[i] & clean[i] & open[i];
        return clear.AsSpan(0, answers);
    }

    private void Judge(QuartileWindows<T> windows, int window, int row, int answers)
    {
        QuantileBlocks<T> blocks = windows.Shared(window);
        int width = blocks.Width;
        Singles.From(blocks.Values(0, row), lower);
        Singles.From(blocks.Values(1, row), medians);
        Singles.From(blocks.Values(2, row), upper);
        noise.VarianceByRow(blocks.X, blocks.Y + row, medians.AsSpan(0, width), variances.AsSpan(0, width));
        double range = rules.Trust * windows.FullRange(window);
        Vector512<float> perRange = Vector512.Create((float)(range * range)), perDistance = Vector512.Create((float)(rules.Threshold * rules.Threshold));
        Vector512<float> step = Vector512.Create((float)rules.QuantisationStep);
        Vector512<float> wider = Vector512.Create(1 + RangeMargin), narrower = Vector512.Create(1 - RangeMargin);
        Vector512<float> above = Vector512.Create(1 + Margin), below = Vector512.Create(1 - Margin);
        for (int answer = 0; answer < answers; answer++)
        {
            ulong trust = 0, distrust = 0, near = 0;
            for (int part = 0; part < Answer; part += Vector512<float>.Count)
            {
                int i = (answer * Answer) + part;
                Vector512<float> variance = Load(variances, i), iqr = Load(upper, i) - Load(lower, i);
                Vector512<float> distance = Load(values, i) - Load(medians, i);
                Vector512<float> wide = Vector512.MaxNative((iqr * wider) - step, Vector512<float>.Zero);
                Vector512<float> narrow = Vector512.MaxNative((iqr * narrower) - step, Vector512<float>.Zero);
                Vector512<float> limit = perRange * variance, reach = perDistance * variance;
                Vector512<float> isHeld = IsHeld(variance) & IsHeld(limit) & IsHeld(reach);
                trust |= (Vector512.LessThanOrEqual(wide * wide * above, limit) & isHeld).ExtractMostSignificantBits() << part;
                distrust |= (Vector512.GreaterThan(narrow * narrow * below, limit) & isHeld).ExtractMostSignificantBits() << part;
                near |= (Vector512.LessThanOrEqual(distance * distance * above, reach) & isHeld).ExtractMostSignificantBits() << part;
            }

            (trusted[answer], untrusted[answer], clean[answer]) = (trust, distrust, near);
        }

        // The expected range is that of full windows.
        ReadOnlySpan<ushort> counts = blocks.Counts(row);
        ushort full = (ushort)windows.FullCount(window);
        for (int i = counts.IndexOfAnyExcept(full); i >= 0 && i < counts.Length; i++)
        {
            if (counts[i] == full)
                continue;
            trusted[i / Answer] &= ~(1UL << (i % Answer));
            untrusted[i / Answer] &= ~(1UL << (i % Answer));
        }
    }

    private static Vector512<float> IsHeld(Vector512<float> square) =>
        Vector512.GreaterThan(square, Vector512.Create(LeastSquare)) & Vector512.LessThan(square, Vector512.Create(MostSquare));

    private static Vector512<float> Load(float[] numbers, int i) =>
        Vector512.LoadUnsafe(ref MemoryMarshal.GetArrayDataReference(numbers), (nuint)i);

    private static TNumber[] Rent<TNumber>(IScratch scratch, int count)
        where TNumber : unmanaged => scratch.Rent<TNumber>(count, 1).Buffer;
}
