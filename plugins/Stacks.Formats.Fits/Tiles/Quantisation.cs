using System.Numerics;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// Floating-point samples of quantised tiles: F = I ZSCALE + ZZERO, or with subtractive dithering
/// F = (I - R + 0.5) ZSCALE + ZZERO, R a random number of [0, 1) that the writer added before it rounded (FITS Standard 4.0,
/// section 10.2; W. Pence, R. Seaman and R. White, PASP 121, 414, 2009).
/// </summary>
internal static class Quantisation
{
    /// <summary>
    /// The integer that stands for exactly 0 under SUBTRACTIVE_DITHER_2, as writers in use have it; the standard's text
    /// says one less.
    /// </summary>
    public const int Zero = -2147483646;

    /// <summary>Length of the sequence of random numbers.</summary>
    public const int Count = 10_000;

    /// <summary>Where in the sequence a tile begins: 500 R of its own number.</summary>
    private const int Spread = 500;

    /// <summary>R_1 to R_10000, as single precision holds them.</summary>
    private static readonly float[] Random = MakeRandom();

    /// <summary>Restores the samples of a tile.</summary>
    /// <typeparam name="T">float or double, by ZBITPIX.</typeparam>
    /// <param name="integers">I.</param>
    /// <param name="scale">ZSCALE.</param>
    /// <param name="zero">ZZERO.</param>
    /// <param name="blank">The integer that stands for NaN, ZBLANK; null where there is none.</param>
    /// <param name="ditherSeed">Number of the tile, from 0, plus ZDITHER0 - 1; null where samples are not dithered.</param>
    /// <param name="keepsZero">True for SUBTRACTIVE_DITHER_2.</param>
    /// <param name="samples">Receives F.</param>
    public static void Restore<T>(ReadOnlySpan<int> integers, double scale, double zero, long? blank, long? ditherSeed, bool keepsZero, Span<T> samples)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        long missing = blank ?? long.MaxValue;
        if (ditherSeed is not { } seed)
        {
            for (int i = 0; i < integers.Length; i++)
                samples[i] = integers[i] == missing ? T.NaN : T.CreateTruncating((integers[i] * scale) + zero);
            return;
        }

        int line = (int)(seed % Count);
        int next = (int)(Random[line] * Spread);
        for (int i = 0; i < integers.Length; i++)
        {
            int integer = integers[i];
            if (integer == missing)
                samples[i] = T.NaN;
            else if (keepsZero && integer == Zero)
                samples[i] = T.Zero;
            else
                samples[i] = T.CreateTruncating(((integer - (double)Random[next] + 0.5) * scale) + zero);

            if (++next == Count)
            {
                line = (line + 1) % Count;
                next = (int)(Random[line] * Spread);
            }
        }
    }

    /// <summary>
    /// R_i = s_i / m, s_i = 16807 s_(i-1) mod m, s_0 = 1, m = 2^31 - 1 (S. Park and K. Miller, CACM 31, 1192, 1988). The
    /// standard gives s_10000 = 1043618065 as the check.
    /// </summary>
    private static float[] MakeRandom()
    {
        const long modulus = int.MaxValue;
        float[] random = new float[Count];
        long state = 1;
        for (int i = 0; i < Count; i++)
        {
            state = 16807 * state % modulus;
            random[i] = (float)(state / (double)modulus);
        }

        return state == 1043618065 ? random : throw new InvalidOperationException("the random numbers of FITS tiles are wrong");
    }
}
