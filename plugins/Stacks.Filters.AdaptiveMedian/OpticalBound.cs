using System.Numerics;
using Stacks.Imaging;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>
/// A real source cannot be sharper than the optics. With r = exp(-4 ln 2 / f^2), a bright candidate v over a base b may
/// be a source only if on all four axes (d = 1 twice, d = sqrt 2 twice) the higher n of the two opposite neighbours has
/// n - b &gt;= 0.7 r^(d d) (v - b) - 2 sigma(v). A neighbour that nobody saw (outside of the frame, missing, defect) may
/// have been the higher one, so it speaks for a source: taken as absent, it would cost the light of every star that an
/// edge or a bad column cuts.
/// </summary>
internal static class OpticalBound
{
    private const double Share = 0.7;
    private const double Slack = 2;

    private static ReadOnlySpan<sbyte> AxisX => [1, 0, 1, 1];

    private static ReadOnlySpan<sbyte> AxisY => [0, 1, 1, -1];

    /// <summary>True when the pixel may be a source.</summary>
    /// <param name="rows">The frame.</param>
    /// <param name="x">Column.</param>
    /// <param name="y">Row.</param>
    /// <param name="fwhm">f, samples, above 0.</param>
    /// <param name="level">b.</param>
    /// <param name="sigma">sigma(v).</param>
    public static bool Allows<T>(ReflectedRows<T> rows, int x, int y, double fwhm, double level, double sigma)
        where T : unmanaged, INumber<T>
    {
        double height = double.CreateTruncating(rows[x, y]) - level;
        for (int axis = 0; axis < AxisX.Length; axis++)
        {
            int dx = AxisX[axis], dy = AxisY[axis];
            double fallOff = Math.Exp(-4 * Math.Log(2) * ((dx * dx) + (dy * dy)) / (fwhm * fwhm));
            double least = level + (Share * fallOff * height) - (Slack * sigma);
            if (!Supports(rows, x + dx, y + dy, least) && !Supports(rows, x - dx, y - dy, least))
                return false;
        }

        return true;
    }

    private static bool Supports<T>(ReflectedRows<T> rows, int x, int y, double least)
        where T : unmanaged, INumber<T> =>
        (uint)x >= (uint)rows.Width || (uint)y >= (uint)rows.Height
        || !rows.TakesPart(x, y)
        || double.CreateTruncating(rows[x, y]) >= least;
}
