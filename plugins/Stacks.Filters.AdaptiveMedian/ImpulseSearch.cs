using System.Numerics;
using System.Runtime.CompilerServices;
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
internal sealed class ImpulseSearch<T>(ImpulseRules rules, WindowQuantiles[] quartiles, Windows<T> windows, NoiseModel noise)
    where T : unmanaged, INumber<T>
{
    /// <summary>Samples that no window sees: nothing was measured there.</summary>
    public const SampleFlags TakeNoPart = SampleFlags.Missing | SampleFlags.Defect;

    private const int Block = 64;
    private const int LeastCount = 3;

    private readonly double[] normalRange =
        [.. from n in Enumerable.Range(0, (rules.LargestWindow * rules.LargestWindow) + 1)
            select n < LeastCount ? double.NaN : NormalOrderStatistics.InterquartileRange(n)];

    /// <summary>Writes, for rows [first, end), each pixel's given flags together with the judgement.</summary>
    [SkipLocalsInit]
    public void Judge(Plane<SampleFlags> given, Plane<SampleFlags> judged, int first, int end)
    {
        Span<T> results = stackalloc T[quartiles.Length * 3 * Block];
        Span<int> counts = stackalloc int[quartiles.Length * Block];
        for (int y = first; y < end; y++)
        {
            given.Row(y).CopyTo(judged.Row(y));
            for (int x = 0; x < windows.Width; x += Block)
                JudgeBlock(judged.Row(y).Slice(x, Math.Min(Block, windows.Width - x)), x, y, results, counts);
        }
    }

    private void JudgeBlock(Span<SampleFlags> judged, int x, int y, Span<T> results, Span<int> counts)
    {
        int length = judged.Length;
        ulong open = 0;
        for (int i = 0; i < length; i++)
        {
            if ((judged[i] & (TakeNoPart | SampleFlags.Saturated)) == 0)
                open |= 1UL << i;
        }

        int computed = 0;
        for (int w = 0; w < quartiles.Length && open != 0; w++)
        {
            quartiles[w].Row(windows, y, x, x + length, results.Slice(w * 3 * Block, 3 * length), counts.Slice(w * Block, length));
            computed = w + 1;
            for (ulong rest = open; rest != 0; rest &= rest - 1)
            {
                int i = BitOperations.TrailingZeroCount(rest);
                Quartiles window = At(results, counts, w, i, length);
                if (window.Count < LeastCount)
                    continue;
                double sigma = noise.Sigma(x + i, y, window.Median);
                if (Math.Max(0, window.Range - rules.QuantisationStep) > rules.Trust * normalRange[window.Count] * sigma)
                    continue;
                open &= ~(1UL << i);
                judged[i] |= Decide(x + i, y, window.Median, rules.Threshold * sigma, rules.Dark);
            }
        }

        for (; open != 0; open &= open - 1)
        {
            int i = BitOperations.TrailingZeroCount(open);
            judged[i] |= WithoutTrust(x + i, y, results, counts, i, length);
        }

        if (rules.PsfFwhm > 0)
            KeepSources(judged, x, y, results, counts, computed);
    }

    private SampleFlags WithoutTrust(int x, int y, Span<T> results, Span<int> counts, int i, int length)
    {
        Quartiles last = At(results, counts, quartiles.Length - 1, i, length);
        if (last.Count < LeastCount)
            return SampleFlags.None;
        if (rules.PsfFwhm == 0)
        {
            double spread = Math.Max(last.Range / normalRange[last.Count], noise.Sigma(x, y, last.Median));
            return Decide(x, y, last.Median, rules.Threshold * spread, rules.Dark);
        }

        int smallest = 0;
        while (counts[(smallest * Block) + i] < LeastCount)
            smallest++;
        double median = At(results, counts, smallest, i, length).Median;
        return Decide(x, y, median, rules.Threshold * noise.Sigma(x, y, median), dark: false);
    }

    private SampleFlags Decide(int x, int y, double median, double limit, bool dark)
    {
        double excess = double.CreateTruncating(windows[x, y]) - median;
        if (dark && -excess > limit)
            return SampleFlags.ReplacedDark;
        return rules.Bright && excess > limit ? SampleFlags.ReplacedBright : SampleFlags.None;
    }

    // Takes back what the optics could have made; the largest window is computed here where no pixel of the block needed it.
    private void KeepSources(Span<SampleFlags> judged, int x, int y, Span<T> results, Span<int> counts, int computed)
    {
        int length = judged.Length, last = quartiles.Length - 1;
        for (int i = 0; i < length; i++)
        {
            if ((judged[i] & SampleFlags.ReplacedBright) == 0)
                continue;
            if (computed <= last)
            {
                quartiles[last].Row(windows, y, x, x + length, results.Slice(last * 3 * Block, 3 * length), counts.Slice(last * Block, length));
                computed = last + 1;
            }

            double sigma = noise.Sigma(x + i, y, double.CreateTruncating(windows[x + i, y]));
            if (OpticalBound.Allows(windows, x + i, y, rules.PsfFwhm, At(results, counts, last, i, length).Lower, sigma))
                judged[i] ^= SampleFlags.ReplacedBright | SampleFlags.KeptAsSource;
        }
    }

    private static Quartiles At(Span<T> results, Span<int> counts, int window, int i, int length)
    {
        int place = (window * 3 * Block) + i;
        return new Quartiles(
            counts[(window * Block) + i],
            double.CreateTruncating(results[place]),
            double.CreateTruncating(results[place + length]),
            double.CreateTruncating(results[place + (2 * length)]));
    }

    private readonly record struct Quartiles(int Count, double Lower, double Median, double Upper)
    {
        public double Range => Upper - Lower;
    }
}
