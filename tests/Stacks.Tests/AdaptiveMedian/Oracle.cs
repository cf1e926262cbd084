using System.Numerics;
using Stacks.Abstractions;

namespace Stacks.Tests.AdaptiveMedian;

/// <summary>What the oracle is asked: parameters under their names in the recipe (fwhm 0 = no point sources).</summary>
internal sealed record OracleRules(double Threshold, double Trust, int LargestWindow, double Fwhm, string Polarity, double QuantisationStep);

/// <summary>
/// The rules of adaptive-median written out from their formulas, one pixel after the other, with its own borders,
/// quantiles and c(n) (numbers integrated in another way than in Stacks.Imaging). Slow and obvious on purpose.
/// </summary>
internal static class Oracle
{
    public static (T[] Output, SampleFlags[] Flags) Run<T>(
        T[] input, SampleFlags[] given, int width, int height, NoiseModel noise, OracleRules rules)
        where T : unmanaged, INumber<T>
    {
        bool bright = rules.Polarity != "dark", dark = rules.Polarity != "bright";
        int largest = bright && rules.Fwhm == 0 ? 3 : rules.LargestWindow;
        bool hasPsf = bright && rules.Fwhm > 0;
        bool TakesPart(int x, int y) => (given[At(x, y)] & (SampleFlags.Missing | SampleFlags.Defect)) == 0;
        int At(int x, int y) => (Mirror(y, height) * width) + Mirror(x, width);
        double Value(int x, int y) => double.CreateChecked(input[At(x, y)]);

        List<double> Window(int x, int y, int side, Func<int, int, bool> wanted)
        {
            List<double> list = [];
            for (int j = -(side / 2); j <= side / 2; j++)
                for (int i = -(side / 2); i <= side / 2; i++)
                    if (wanted(x + i, y + j))
                        list.Add(Value(x + i, y + j));
            list.Sort();
            return list;
        }

        SampleFlags[] judged = (SampleFlags[])given.Clone();
        for (int y = 0; y < height; y++)
        {
            for (int x = 0; x < width; x++)
            {
                if (!TakesPart(x, y) || (given[At(x, y)] & SampleFlags.Saturated) != 0)
                    continue;
                double v = Value(x, y), firstMedian = double.NaN, m = 0, iqr = 0, c = 0;
                bool trusted = false;
                for (int k = 3; k <= largest && !trusted; k += 2)
                {
                    List<double> w = Window(x, y, k, TakesPart);
                    if (w.Count < 3)
                        continue;
                    m = Type7<T>(w, 0.5);
                    iqr = Type7<T>(w, 0.75) - Type7<T>(w, 0.25);
                    c = NormalRange(w.Count);
                    if (double.IsNaN(firstMedian))
                        firstMedian = m;
                    trusted = Math.Max(0, iqr - rules.QuantisationStep) <= rules.Trust * c * noise.Sigma(x, y, m);
                }

                if (double.IsNaN(firstMedian))
                    continue;
                double difference, limit;
                if (trusted)
                    (difference, limit) = (v - m, rules.Threshold * noise.Sigma(x, y, m));
                else if (hasPsf)
                    (difference, limit) = (Math.Max(0, v - firstMedian), rules.Threshold * noise.Sigma(x, y, firstMedian));
                else
                    (difference, limit) = (v - m, rules.Threshold * Math.Max(iqr / c, noise.Sigma(x, y, m)));

                if (dark && -difference > limit)
                    judged[At(x, y)] |= SampleFlags.ReplacedDark;
                if (bright && difference > limit)
                    judged[At(x, y)] |= hasPsf && IsPossibleSource(x, y, v) ? SampleFlags.KeptAsSource : SampleFlags.ReplacedBright;
            }
        }

        bool IsPossibleSource(int x, int y, double v)
        {
            double floor = Type7<T>(Window(x, y, largest, TakesPart), 0.25);
            double r = Math.Exp(-4 * Math.Log(2) / (rules.Fwhm * rules.Fwhm));
            double slack = 2 * noise.Sigma(x, y, v);
            bool Axis(int dx, int dy)
            {
                double fallOff = dx != 0 && dy != 0 ? r * r : r;
                bool Seen(int i, int j) => i >= 0 && j >= 0 && i < width && j < height && TakesPart(i, j);
                if (!Seen(x + dx, y + dy) || !Seen(x - dx, y - dy))
                    return true;
                double higher = Math.Max(Value(x + dx, y + dy), Value(x - dx, y - dy));
                return higher - floor >= (0.7 * fallOff * (v - floor)) - slack;
            }

            return Axis(1, 0) && Axis(0, 1) && Axis(1, 1) && Axis(1, -1);
        }

        T[] output = (T[])input.Clone();
        SampleFlags[] flags = (SampleFlags[])given.Clone();
        for (int y = 0; y < height; y++)
        {
            for (int x = 0; x < width; x++)
            {
                SampleFlags own = judged[At(x, y)];
                flags[At(x, y)] |= own & SampleFlags.KeptAsSource;
                bool defect = (own & SampleFlags.Defect) != 0 && (own & SampleFlags.Missing) == 0;
                if (!defect && (own & (SampleFlags.ReplacedBright | SampleFlags.ReplacedDark)) == 0)
                    continue;
                for (int k = 3; k <= 63; k += 2)
                {
                    List<double> sound = Window(x, y, k, (i, j) => (judged[At(i, j)] & ~SampleFlags.KeptAsSource) == 0);
                    if (sound.Count < 3)
                        continue;
                    double median = Type7<T>(sound, 0.5);
                    output[At(x, y)] = T.CreateChecked(median);
                    if (defect)
                        own |= Value(x, y) < median ? SampleFlags.ReplacedDark : SampleFlags.ReplacedBright;
                    flags[At(x, y)] |= own & (SampleFlags.ReplacedBright | SampleFlags.ReplacedDark);
                    break;
                }
            }
        }

        return (output, flags);
    }

    /// <summary>dcb|abcd|cba by walking: turn round at each end.</summary>
    public static int Mirror(int place, int length)
    {
        while (place < 0 || place >= length)
            place = length == 1 ? 0 : place < 0 ? -place : (2 * (length - 1)) - place;
        return place;
    }

    /// <summary>Type 7 of Hyndman and Fan in the type's own rounding.</summary>
    private static double Type7<T>(List<double> sorted, double p)
        where T : unmanaged, INumber<T>
    {
        double h = (sorted.Count - 1) * p;
        int low = (int)Math.Floor(h);
        double value = low + 1 < sorted.Count ? sorted[low] + ((h - low) * (sorted[low + 1] - sorted[low])) : sorted[low];
        return T.One / (T.One + T.One) == T.Zero ? Math.Round(value, MidpointRounding.ToEven) : double.CreateChecked(T.CreateChecked(value));
    }

    private static readonly Dictionary<int, double> Known = [];

    /// <summary>Expected type-7 IQR of n unit normals: weights of the sorted sample under the exact binomial law.</summary>
    public static double NormalRange(int n)
    {
        lock (Known)
        {
            if (Known.TryGetValue(n, out double known))
                return known;
            double h = (n - 1) * 0.75;
            int low = (int)h;
            double upper = Expected(low + 1, n);
            if (h > low)
                upper += (h - low) * (Expected(low + 2, n) - upper);
            return Known[n] = 2 * upper;
        }
    }

    // E X(r:n) = integral over x > 0 of P(X(r) > x) - P(X(r) < -x), by Simpson's rule; no density, no factorials beyond C(n, j).
    private static double Expected(int rank, int n)
    {
        const int Steps = 2000;
        const double End = 9;
        double sum = 0;
        for (int i = 0; i <= Steps; i++)
        {
            double x = End * i / Steps, p = MathNet.Numerics.Distributions.Normal.CDF(0, 1, x), q = MathNet.Numerics.Distributions.Normal.CDF(0, 1, -x);
            double above = AtMost(rank - 1, n, p), below = 1 - AtMost(rank - 1, n, q);
            sum += (i == 0 || i == Steps ? 1 : i % 2 == 1 ? 4 : 2) * (above - below);
        }

        return sum * End / Steps / 3;
    }

    private static double AtMost(int most, int n, double p)
    {
        if (p >= 1)
            return most >= n ? 1 : 0;
        if (p <= 0)
            return 1;
        double logTerm = n * Math.Log(1 - p), total = 0;
        for (int j = 0; j <= most; j++)
        {
            total += Math.Exp(logTerm);
            logTerm += Math.Log((n - j) / (j + 1.0)) + Math.Log(p) - Math.Log(1 - p);
        }

        return total;
    }
}
