namespace Stacks.SampleStacks;

/// <summary>
/// Elementary functions from +, -, *, / and square root alone. IEEE 754 fixes those five to the last bit, so these
/// give the same bits on every machine; a platform's exp, log and erf do not promise that.
/// </summary>
internal static class Elementary
{
    // ln 2 in two parts: the upper has 21 zero bits at its end, so that k * upper is exact for every exponent k.
    private const double LogTwoUpper = 6.93147180369123816490e-01;
    private const double LogTwoLower = 1.90821492927058770002e-10;
    private const double TwoOverRootPi = 1.1283791670955126;
    private const double HalfLogTwoPi = 0.91893853320467274178;

    /// <summary>e^x to about 1e-16 relative; 0 below -700.</summary>
    public static double Exp(double x)
    {
        if (x < -700)
            return 0;
        double k = Math.Round(x / (LogTwoUpper + LogTwoLower));
        double r = (x - (k * LogTwoUpper)) - (k * LogTwoLower);
        double sum = 1;
        for (int i = 14; i >= 1; i--)
            sum = 1 + (r / i * sum);
        return Math.ScaleB(sum, (int)k);
    }

    /// <summary>ln x for x above 0, to about 1e-16: ln x = k ln 2 + 2 artanh((m - 1) / (m + 1)), m in [0.7, 1.4].</summary>
    public static double Log(double x)
    {
        int k = Math.ILogB(x);
        double m = Math.ScaleB(x, -k);
        if (m > 1.4142135623730951)
        {
            m /= 2;
            k++;
        }

        double s = (m - 1) / (m + 1);
        double sum = 0;
        for (int i = 25; i >= 1; i -= 2)
            sum = (sum * s * s) + (1.0 / i);
        return (k * LogTwoUpper) + ((k * LogTwoLower) + (2 * s * sum));
    }

    /// <summary>
    /// erf x = 2/sqrt(pi) e^(-x^2) sum_n 2^n x^(2n+1) / (2n+1)!! (Abramowitz and Stegun 7.1.6): all terms of one sign.
    /// </summary>
    public static double Erf(double x)
    {
        if (Math.Abs(x) > 6)
            return Math.Sign(x);
        double term = x, sum = 0;
        for (int n = 1; Math.Abs(term) > 1e-18 * Math.Abs(sum); n++)
        {
            sum += term;
            term *= 2 * x * x / ((2 * n) + 1);
        }

        return TwoOverRootPi * Exp(-x * x) * sum;
    }

    /// <summary>ln k! by Stirling's series, shifted to where five terms reach 1e-15.</summary>
    public static double LogFactorial(double k)
    {
        double x = k + 1, product = 1;
        while (x < 16)
            product *= x++;
        double inverse = 1 / x, square = inverse * inverse;
        double series = inverse * ((1.0 / 12) - (square * ((1.0 / 360) - (square * ((1.0 / 1260) - (square * ((1.0 / 1680) - (square / 1188))))))));
        return ((x - 0.5) * Log(x)) - x + HalfLogTwoPi + series - Log(product);
    }
}
