using Stacks.Abstractions;

namespace Stacks.Noise;

/// <summary>
/// Robust standard deviation of a symmetric distribution about 0: the interquartile range / 1.349. Where samples are so
/// coarse that 7 % of them share a quartile's value (for responses of the difference mask: a sigma below about three
/// quarters of a quantisation step) the range is off by per cents, and the root mean square of the samples within five
/// sigmas is taken instead.
/// </summary>
public static class Spread
{
    /// <summary>Interquartile range of unit normal noise, 2 x 0.67449 (METHODS 1; Harter 1961).</summary>
    public const double NormalInterquartileRange = 1.348980;

    private const double CoarseShare = 0.07;
    private const double FewSigmas = 5;

    /// <summary>Measures a spread.</summary>
    /// <param name="samples">At least one; finite.</param>
    /// <param name="counts">Scratch of <see cref="RankSelection.Counts"/>.</param>
    /// <param name="coarse">True when the second form was taken.</param>
    public static double Of(ReadOnlySpan<double> samples, Span<int> counts, out bool coarse)
    {
        double range = Quantile(samples, 0.75, counts, out double shareHigh) - Quantile(samples, 0.25, counts, out double shareLow);
        double sigma = range / NormalInterquartileRange;
        coarse = Math.Max(shareLow, shareHigh) > CoarseShare;
        return coarse ? WithinFewSigmas(samples, sigma) : sigma;
    }

    /// <summary>Root mean square of the samples within five sigmas, sigma being that root mean square.</summary>
    /// <param name="samples">At least one; finite.</param>
    /// <param name="start">A first guess; 0 to take the smallest sample that is not 0.</param>
    public static double WithinFewSigmas(ReadOnlySpan<double> samples, double start)
    {
        double sigma = start > 0 ? start : SmallestNonZero(samples);
        for (int round = 0; round < 50; round++)
        {
            double sum = 0;
            int count = 0;
            foreach (double sample in samples)
            {
                if (Math.Abs(sample) <= FewSigmas * sigma)
                {
                    sum += sample * sample;
                    count++;
                }
            }

            double next = count == 0 ? 0 : Math.Sqrt(sum / count);
            if (next == sigma || next == 0)
                return next;
            sigma = next;
        }

        return sigma;
    }

    /// <summary>
    /// Mid-quantile: the distribution function halfway up each value's step, joined by straight lines (Ma, Genton and
    /// Parzen, Annals of the Institute of Statistical Mathematics 63 (2011) 227). On rounded samples it is the quantile
    /// of grouped data, on continuous ones the usual quantile.
    /// </summary>
    private static double Quantile(ReadOnlySpan<double> samples, double probability, Span<int> counts, out double share)
    {
        double place = probability * samples.Length;
        long rank = Math.Min((long)place, samples.Length - 1);
        RankedSample<double> at = RankSelection.Select(samples, [], SampleFlags.None, rank, counts);
        share = (double)at.Equal / samples.Length;
        double middle = at.Below + (at.Equal / 2.0);
        if (place == middle || at.Equal == samples.Length)
            return at.Value;

        bool isBelow = place < middle;
        if (isBelow ? at.Below == 0 : at.Below + at.Equal == samples.Length)
            return at.Value;
        RankedSample<double> neighbour = RankSelection.Neighbour(samples, at, isBelow);
        double neighbourMiddle = neighbour.Below + (neighbour.Equal / 2.0);
        return at.Value + ((neighbour.Value - at.Value) * (place - middle) / (neighbourMiddle - middle));
    }

    private static double SmallestNonZero(ReadOnlySpan<double> samples)
    {
        double smallest = double.PositiveInfinity;
        foreach (double sample in samples)
        {
            if (sample != 0)
                smallest = Math.Min(smallest, Math.Abs(sample));
        }

        return double.IsFinite(smallest) ? smallest : 0;
    }
}
