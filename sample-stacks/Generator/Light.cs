namespace Stacks.SampleStacks;

/// <summary>Expected electrons in every pixel of a frame: light before the detector draws its noise.</summary>
/// <param name="width">Columns.</param>
/// <param name="height">Rows.</param>
internal sealed class Light(int width, int height)
{
    /// <summary>Columns.</summary>
    public int Width { get; } = width;

    /// <summary>Rows.</summary>
    public int Height { get; } = height;

    /// <summary>Electrons, row after row.</summary>
    public double[] Electrons { get; } = new double[width * height];

    /// <summary>Electrons at column x of row y.</summary>
    public ref double this[int x, int y] => ref Electrons[(y * Width) + x];

    /// <summary>
    /// Adds a point source: a Gaussian of full width at half maximum <paramref name="fwhm"/>, integrated over each
    /// pixel. Pixel (0, 0) is centred on x = 0, y = 0.
    /// </summary>
    public void AddPointSource(double flux, double x, double y, double fwhm)
    {
        // FWHM = 2 sqrt(2 ln 2) sigma
        double sigma = fwhm / 2.3548200450309493;
        int reach = (int)Math.Ceiling(8 * sigma);
        int left = (int)Math.Floor(x) - reach, top = (int)Math.Floor(y) - reach, side = (2 * reach) + 2;
        double[] across = Shares(x - left, sigma, side), down = Shares(y - top, sigma, side);
        for (int row = Math.Max(top, 0); row < Math.Min(top + side, Height); row++)
        {
            for (int column = Math.Max(left, 0); column < Math.Min(left + side, Width); column++)
                this[column, row] += flux * down[row - top] * across[column - left];
        }
    }

    /// <summary>Adds a soft disc: an elliptical Gaussian of the given peak, axes along x and y turned by (cos, sin).</summary>
    public void AddBlob(double peak, double x, double y, double sigmaLong, double sigmaShort, (double Cos, double Sin) turn)
    {
        int reach = (int)Math.Ceiling(5 * Math.Max(sigmaLong, sigmaShort));
        for (int row = Math.Max((int)y - reach, 0); row < Math.Min((int)y + reach, Height); row++)
        {
            for (int column = Math.Max((int)x - reach, 0); column < Math.Min((int)x + reach, Width); column++)
            {
                double along = (((column - x) * turn.Cos) + ((row - y) * turn.Sin)) / sigmaLong;
                double aside = (((row - y) * turn.Cos) - ((column - x) * turn.Sin)) / sigmaShort;
                this[column, row] += peak * Elementary.Exp(-0.5 * ((along * along) + (aside * aside)));
            }
        }
    }

    // The share of a unit Gaussian about `centre` that falls on each of the pixels 0 .. count - 1.
    private static double[] Shares(double centre, double sigma, int count)
    {
        double[] shares = new double[count];
        double below = Elementary.Erf((-0.5 - centre) / (sigma * 1.4142135623730951));
        for (int i = 0; i < count; i++)
        {
            double above = Elementary.Erf((i + 0.5 - centre) / (sigma * 1.4142135623730951));
            shares[i] = (above - below) / 2;
            below = above;
        }

        return shares;
    }
}
