using System.Numerics;
using Stacks.Imaging;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>
/// A real source cannot be sharper than the optics. With r = exp(-4 ln 2 / f^2), a bright candidate v over a base b may
/// be a source only if on all four axes (d = 1 twice, d = sqrt 2 twice) the higher n of the two opposite neighbours has
/// n - b &gt;= 0.7 r^(d d) (v - b) - 2 sigma(v). Neighbours outside of the frame are reflected like every window;
/// an axis with a neighbour that takes no part in windows says nothing against a source: beside a dead pixel, the wing
/// of a star would otherwise look sharp.
/// </summary>
internal static class OpticalBound
{
    private const double Share = 0.7;
    private const double Slack = 2;

    private static ReadOnlySpan<sbyte> AxisX => [1, 0, 1, 1];

    private static ReadOnlySpan<sbyte> AxisY => [0, 1, 1, -1];

    /// <summary>True when the pixel may be a source.</summary>
    /// <param name="windows">The frame.</param>
    /// <param name="x">Column.</param>
    /// <param name="y">Row.</param>
    /// <param name="fwhm">f, samples, above 0.</param>
    /// <param name="floor">b.</param>
    /// <param name="sigma">sigma(v).</param>
    public static bool Allows<T>(Windows<T> windows, int x, int y, double fwhm, double floor, double sigma)
        where T : unmanaged, INumber<T>
    {
        double height = double.CreateTruncating(windows[x, y]) - floor;
        for (int axis = 0; axis < AxisX.Length; axis++)
        {
            int dx = AxisX[axis], dy = AxisY[axis];
            double fallOff = Math.Exp(-4 * Math.Log(2) * ((dx * dx) + (dy * dy)) / (fwhm * fwhm));
            double least = (Share * fallOff * height) - (Slack * sigma);
            if (!Reaches(windows, x + dx, y + dy, floor + least) && !Reaches(windows, x - dx, y - dy, floor + least))
                return false;
        }

        return true;
    }

    private static bool Reaches<T>(Windows<T> windows, int x, int y, double level)
        where T : unmanaged, INumber<T> =>
        !windows.TakesPart(x, y) || double.CreateTruncating(windows[x, y]) >= level;
}
