using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>
/// Judges every pixel v by the windows k = 3, 5, ... K around it, with quartiles Q1, m, Q3 of n samples:
/// the first with max(0, IQR - q) &lt;= g c(n) sigma(m) is trusted and decides by |v - m| &gt; t sigma(m). Where none is,
/// with a PSF, v - m3 &gt; t sigma(m3) decides (m3 the median of the smallest window), without one
/// |v - m| &gt; t max(IQR / c(n), sigma(m)) at K. Windows of fewer than 3 samples are passed over. A bright candidate
/// that <see cref="OpticalBound"/> allows over Q1 of window K is kept as a source; Q1 of a small window inside a star
/// would be star light itself.
/// </summary>
internal sealed class ImpulseSearch<T>(ImpulseRules rules, QuartileKernels kernels, ReflectedRows<T> rows, NoiseModel noise)
    where T : unmanaged, INumber<T>
{
    /// <summary>Samples that no window sees: nothing was measured there.</summary>
    public const SampleFlags TakeNoPart = SampleFlags.Missing | SampleFlags.Defect;

    private const int LeastCount = 3;

    private readonly double[] normalRange =
        [.. from n in Enumerable.Range(0, (rules.LargestWindow * rules.LargestWindow) + 1)
            select n < LeastCount ? double.NaN : NormalOrderStatistics.InterquartileRange(n)];

    /// <summary>Writes, for rows [first, end), each pixel's given flags together with the judgement.</summary>
    public void Judge(Plane<SampleFlags> given, Plane<SampleFlags> judged, int first, int end, FrameContext context)
    {
        QuartileWindows<T> windows = new(kernels, rows, first, end, context.Scratch);
        ClearPixels<T> clearPixels = new(rules, noise, context.Scratch);
        while (windows.Advance())
        {
            context.Cancellation.ThrowIfCancellationRequested();
            for (int row = 0; row < windows.Height; row++)
            {
                int y = windows.Y + row;
                Span<SampleFlags> results = judged.Row(y).Slice(windows.X, windows.Width);
                given.Row(y).Slice(windows.X, windows.Width).CopyTo(results);
                ReadOnlySpan<ulong> clear = clearPixels.Find(windows, row, rows.Plain(windows.X, y, windows.Width));
                for (int i = 0; i < results.Length; i++)
                {
                    ulong rest = ~clear[i / ClearPixels<T>.Answer] >> (i % ClearPixels<T>.Answer);
                    if (rest == 0)
                    {
                        i |= ClearPixels<T>.Answer - 1;
                        continue;
                    }

                    i += BitOperations.TrailingZeroCount(rest);
                    if (i < results.Length && (results[i] & (TakeNoPart | SampleFlags.Saturated)) == 0)
                        results[i] |= Judge(windows, i, row);
                }
            }
        }
    }

    private SampleFlags Judge(QuartileWindows<T> windows, int i, int row)
    {
        int x = windows.X + i, y = windows.Y + row;
        SampleFlags judgement = FirstTrusted(windows, i, row);
        if (judgement != SampleFlags.ReplacedBright || rules.PsfFwhm == 0)
            return judgement;
        double sigma = noise.Sigma(x, y, double.CreateTruncating(rows[x, y]));
        double level = windows.At(windows.Count - 1, i, row).Lower;
        return OpticalBound.Allows(rows, x, y, rules.PsfFwhm, level, sigma) ? SampleFlags.KeptAsSource : judgement;
    }

    private SampleFlags FirstTrusted(QuartileWindows<T> windows, int i, int row)
    {
        int x = windows.X + i, y = windows.Y + row;
        Quartiles smallest = default, last = default;
        for (int w = 0; w < windows.Count; w++)
        {
            last = windows.At(w, i, row);
            if (last.Count < LeastCount)
                continue;
            if (smallest.Count == 0)
                smallest = last;
            double sigma = noise.Sigma(x, y, last.Median);
            if (Math.Max(0, last.Range - rules.QuantisationStep) <= rules.Trust * normalRange[last.Count] * sigma)
                return Decide(x, y, last.Median, rules.Threshold * sigma, rules.Dark);
        }

        if (last.Count < LeastCount)
            return SampleFlags.None;
        if (rules.PsfFwhm > 0)
            return Decide(x, y, smallest.Median, rules.Threshold * noise.Sigma(x, y, smallest.Median), dark: false);
        double spread = Math.Max(last.Range / normalRange[last.Count], noise.Sigma(x, y, last.Median));
        return Decide(x, y, last.Median, rules.Threshold * spread, rules.Dark);
    }

    private SampleFlags Decide(int x, int y, double median, double limit, bool dark)
    {
        double excess = double.CreateTruncating(rows[x, y]) - median;
        if (dark && -excess > limit)
            return SampleFlags.ReplacedDark;
        return rules.Bright && excess > limit ? SampleFlags.ReplacedBright : SampleFlags.None;
    }
}
