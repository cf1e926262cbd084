namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// Smoothing of the coefficients of a lossy H-transform: each difference is moved, by less than the rounding of the
/// coefficients, towards the slope between the neighbouring sums, unless these are not monotonic (R. White, in "Digitised
/// Optical Sky Surveys", 1992). Differences at the edge stay.
/// </summary>
internal static class HSmoothing
{
    /// <summary>Smooths a level in place.</summary>
    /// <param name="a">Interleaved coefficients.</param>
    /// <param name="width">Coefficients in a row of the level.</param>
    /// <param name="height">Rows of the level.</param>
    /// <param name="stride">Coefficients in a row of the array.</param>
    /// <param name="most">Most that a coefficient is moved.</param>
    public static void Apply(Span<long> a, int width, int height, int stride, long most)
    {
        for (int y = 2; y < height - 2; y += 2)
        {
            for (int x = 0; x < width; x += 2)
            {
                int at = (y * stride) + x;
                a[at + stride] += Move(a[at - (2 * stride)], a[at], a[at + (2 * stride)], a[at + stride], most);
            }
        }

        for (int y = 0; y < height; y += 2)
        {
            for (int x = 2; x < width - 2; x += 2)
            {
                int at = (y * stride) + x;
                a[at + 1] += Move(a[at - 2], a[at], a[at + 2], a[at + 1], most);
            }
        }

        for (int y = 2; y < height - 2; y += 2)
        {
            for (int x = 2; x < width - 2; x += 2)
                a[(y * stride) + x + stride + 1] += MoveCurvature(a, (y * stride) + x, stride, most);
        }
    }

    /// <summary>For a slope: 8 times the difference should be the step from the sum before to the sum behind.</summary>
    private static long Move(long before, long here, long behind, long difference, long most)
    {
        long highest = 4 * Math.Max(Math.Min(behind - here, here - before), 0);
        long lowest = 4 * Math.Min(Math.Max(behind - here, here - before), 0);
        return lowest < highest ? Limited(Math.Clamp(behind - before, lowest, highest) - (8 * difference), 8, most) : 0;
    }

    /// <summary>For a curvature: 64 times the difference should be that of the sums at the four corners.</summary>
    private static long MoveCurvature(Span<long> a, int at, int stride, long most)
    {
        long h0 = a[at];
        long beforeBoth = a[at - (2 * stride) - 2], below = a[at + (2 * stride) - 2], right = a[at - (2 * stride) + 2], behindBoth = a[at + (2 * stride) + 2];
        long slopeX = 2 * a[at + stride], slopeY = 2 * a[at + 1];
        long highest = 16 * Math.Min(
            Math.Min(Math.Max(behindBoth - h0, 0) - slopeX - slopeY, Math.Max(h0 - below, 0) + slopeX - slopeY),
            Math.Min(Math.Max(h0 - right, 0) - slopeX + slopeY, Math.Max(beforeBoth - h0, 0) + slopeX + slopeY));
        long lowest = 16 * Math.Max(
            Math.Max(Math.Min(behindBoth - h0, 0) - slopeX - slopeY, Math.Min(h0 - below, 0) + slopeX - slopeY),
            Math.Max(Math.Min(h0 - right, 0) - slopeX + slopeY, Math.Min(beforeBoth - h0, 0) + slopeX + slopeY));
        return lowest < highest
            ? Limited(Math.Clamp(behindBoth + beforeBoth - right - below, lowest, highest) - (64 * a[at + stride + 1]), 64, most)
            : 0;
    }

    private static long Limited(long change, long divisor, long most) => Math.Clamp(change / divisor, -most, most);
}
