namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// The H-transform: a two-dimensional Haar transform of integers, of blocks of 2 x 2 and of their sums again (R. White, in
/// "Digitised Optical Sky Surveys", 1992). A block has h0, the sum of its four pixels; hx, the lower two minus the upper
/// two; hy, the right two minus the left two; hc, lower right and upper left minus the others. All four have one parity,
/// so the forward transform keeps the lowest bit in hc alone: it rounds hx and hy away from 0 and h0 to the nearest; the
/// inverse takes those bits back, and is exact.
/// </summary>
internal static class HTransform
{
    /// <summary>Inverts the transform in place.</summary>
    /// <param name="a">Coefficients, the sums in the first quadrant; then pixels, row-major.</param>
    /// <param name="width">Pixels in a row.</param>
    /// <param name="height">Rows.</param>
    /// <param name="smoothing">The scale of the coefficients of a tile that is to be smoothed; 0 or 1 for none.</param>
    public static void Invert(Span<long> a, int width, int height, int smoothing)
    {
        int levels = 0;
        while (1 << levels < Math.Max(width, height))
            levels++;
        a[0] = levels == 0 ? a[0] : Round(a[0], levels + 1);
        long[] line = new long[(Math.Max(width, height) + 1) / 2];
        for (int level = levels - 1; level >= 0; level--)
        {
            // At this level a pixel stands for 2^level x 2^level pixels of the image.
            int levelWidth = ((width - 1) >> level) + 1, levelHeight = ((height - 1) >> level) + 1;
            for (int y = 0; y < levelHeight; y++)
                Interleave(a, y * width, levelWidth, 1, line);
            for (int x = 0; x < levelWidth; x++)
                Interleave(a, x, levelHeight, width, line);
            if (smoothing > 1)
                HSmoothing.Apply(a, levelWidth, levelHeight, width, smoothing / 2);
            InvertLevel(a, levelWidth, levelHeight, width, level);
        }
    }

    /// <summary>The first half of a line to its even places, the second half to its odd places.</summary>
    private static void Interleave(Span<long> a, int start, int count, int stride, Span<long> line)
    {
        int half = (count + 1) / 2;
        for (int i = half; i < count; i++)
            line[i - half] = a[start + (i * stride)];
        for (int i = half - 1; i > 0; i--)
            a[start + (2 * i * stride)] = a[start + (i * stride)];
        for (int i = half; i < count; i++)
            a[start + (((2 * (i - half)) + 1) * stride)] = line[i - half];
    }

    /// <summary>Blocks of coefficients to blocks of pixels. Sums are divided by 2, and by 4 at the last level.</summary>
    private static void InvertLevel(Span<long> a, int width, int height, int stride, int level)
    {
        int shift = level == 0 ? 2 : 1;
        long bit0 = 1L << level, bit1 = bit0 << 1;
        for (int y = 0; y < height; y += 2)
        {
            for (int x = 0; x < width; x += 2)
            {
                int at = (y * stride) + x;
                bool hasRight = x + 1 < width, hasBelow = y + 1 < height;
                long h0 = a[at];
                if (hasRight && hasBelow)
                {
                    long hx = Round(a[at + stride], level + 1), hy = Round(a[at + 1], level + 1), hc = Round(a[at + stride + 1], level);
                    long low0 = hc & bit0;
                    hx -= hx >= 0 ? low0 : -low0;
                    hy -= hy >= 0 ? low0 : -low0;
                    long low1 = (hc ^ hx ^ hy) & bit1;
                    if (h0 >= 0)
                        h0 += low0 - low1;
                    else
                        h0 += low0 == 0 ? low1 : low0 - low1;
                    a[at + stride + 1] = (h0 + hx + hy + hc) >> shift;
                    a[at + stride] = (h0 + hx - hy - hc) >> shift;
                    a[at + 1] = (h0 - hx + hy - hc) >> shift;
                    a[at] = (h0 - hx - hy + hc) >> shift;
                }
                else if (hasRight || hasBelow)
                {
                    int other = at + (hasRight ? 1 : stride);
                    long difference = Round(a[other], level + 1);
                    long low1 = difference & bit1;
                    h0 += h0 >= 0 ? -low1 : low1;
                    a[other] = (h0 + difference) >> shift;
                    a[at] = (h0 - difference) >> shift;
                }
                else
                {
                    a[at] = h0 >> shift;
                }
            }
        }
    }

    /// <summary>To the nearest multiple of 2^bits, halves away from 0.</summary>
    private static long Round(long value, int bits)
    {
        long half = (1L << bits) >> 1;
        return (value + (value >= 0 || half == 0 ? half : half - 1)) & -(1L << bits);
    }
}
