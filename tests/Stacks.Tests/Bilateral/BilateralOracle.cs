namespace Stacks.Tests.Bilateral;

/// <summary>
/// The bilateral filter written down from its formula, pixel by pixel with Math.Exp, in double and cut at 6 ss:
/// Tomasi and Manduchi, ICCV 1998; the exchange form with c by Sinkhorn rounds after Milanfar 2013.
/// </summary>
internal static class BilateralOracle
{
    public static double[] Plain(double[] v, double[] t, bool[] valid, int width, int height, double spatial, double range)
    {
        double[,] w = Weights(t, valid, width, height, spatial, range);
        double[] result = (double[])v.Clone();
        for (int p = 0; p < v.Length; p++)
        {
            double sum = 0, weight = 0;
            for (int q = 0; q < v.Length; q++)
            {
                if (w[p, q] > 0)
                {
                    sum += w[p, q] * v[q];
                    weight += w[p, q];
                }
            }

            if (valid[p])
                result[p] = sum / weight;
        }

        return result;
    }

    /// <summary>The result, and what each pixel keeps of itself.</summary>
    public static (double[] Result, double[] SelfWeights) Exchange(
        double[] v, double[] t, bool[] valid, int width, int height, double spatial, double range)
    {
        double[,] w = Weights(t, valid, width, height, spatial, range);
        int n = v.Length;
        double[] c = [.. Enumerable.Range(0, n).Select(p => 1 / Math.Sqrt(Row(w, p, q => 1)))];
        for (int round = 0; round < 3; round++)
            c = [.. Enumerable.Range(0, n).Select(p => Math.Sqrt(c[p] / Row(w, p, q => c[q])))];
        double[] off = [.. Enumerable.Range(0, n).Select(p => c[p] * Row(w, p, q => q == p ? 0 : c[q]))];
        c = [.. Enumerable.Range(0, n).Select(p => c[p] * Math.Min(1, 1 / off[p]))];

        double[] result = (double[])v.Clone();
        double[] self = new double[n];
        for (int p = 0; p < n; p++)
        {
            self[p] = 1;
            if (!valid[p])
                continue;
            result[p] += c[p] * Row(w, p, q => c[q] * (v[q] - v[p]));
            self[p] -= c[p] * Row(w, p, q => q == p ? 0 : c[q]);
        }

        return (result, self);
    }

    private static double[,] Weights(double[] t, bool[] valid, int width, int height, double spatial, double range)
    {
        int n = width * height;
        double[,] w = new double[n, n];
        for (int p = 0; p < n; p++)
        {
            for (int q = 0; q < n; q++)
            {
                double dx = (q % width) - (p % width), dy = (q / width) - (p / width);
                double squared = (dx * dx) + (dy * dy);
                if (valid[p] && valid[q] && squared <= 36 * spatial * spatial)
                    w[p, q] = Math.Exp(-squared / (2 * spatial * spatial)) * Math.Exp(-(t[p] - t[q]) * (t[p] - t[q]) / (2 * range * range));
            }
        }

        return w;
    }

    private static double Row(double[,] w, int p, Func<int, double> term)
    {
        double sum = 0;
        for (int q = 0; q < w.GetLength(0); q++)
        {
            if (w[p, q] > 0)
                sum += w[p, q] * term(q);
        }

        return sum;
    }
}
