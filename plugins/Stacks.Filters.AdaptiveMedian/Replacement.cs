using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>
/// Replaces impulses and defects by the median of the sound samples in the smallest window that holds at least 3 of
/// them: neither missing, saturated nor defect, nor themselves impulses. A pixel without 3 such samples within
/// <see cref="LargestRadius"/> is left: a value from further away would be invented.
/// </summary>
internal static class Replacement<T>
    where T : unmanaged, INumber<T>
{
    /// <summary>Radius of the largest window, in samples.</summary>
    public const int LargestRadius = 31;

    private const int LeastCount = 3;
    private const SampleFlags Unsound = SampleFlags.Missing | SampleFlags.Saturated | SampleFlags.Defect | SampleFlags.Replaced;

    /// <summary>Writes the replacements of rows [first, end) and the decisions that took effect.</summary>
    /// <param name="input">The frame.</param>
    /// <param name="judged">Judgement on every pixel of the whole frame.</param>
    /// <param name="flags">Receives Replaced and KeptAsSource flags.</param>
    /// <param name="output">Receives replacement values, and nothing else.</param>
    /// <param name="first">First row.</param>
    /// <param name="end">Row after the last.</param>
    [SkipLocalsInit]
    public static void Replace(
        Plane<T> input, Plane<SampleFlags> judged, Plane<SampleFlags> flags, Plane<T> output, int first, int end)
    {
        const int Side = (2 * LargestRadius) + 1;
        Span<T> sound = stackalloc T[Side * Side];
        for (int y = first; y < end; y++)
        {
            ReadOnlySpan<SampleFlags> row = judged.Row(y);
            for (int x = 0; ; x++)
            {
                // Defects and judgements are the upper bits, so a byte with any of them is at least the lowest of them.
                int next = MemoryMarshal.AsBytes(row[x..]).IndexOfAnyInRange((byte)SampleFlags.Defect, byte.MaxValue);
                if (next < 0)
                    break;
                x += next;
                flags[x, y] |= row[x] & SampleFlags.KeptAsSource;
                bool isDefect = (row[x] & (SampleFlags.Defect | SampleFlags.Missing)) == SampleFlags.Defect;
                if (!isDefect && (row[x] & SampleFlags.Replaced) == 0)
                    continue;
                int count = Gather(input, judged, x, y, sound);
                if (count < LeastCount)
                    continue;
                sound[..count].Sort();
                T median = Quantile.OfSorted<T>(sound[..count], 0.5);
                output[x, y] = median;
                flags[x, y] |= !isDefect ? row[x] & SampleFlags.Replaced
                    : input[x, y] < median ? SampleFlags.ReplacedDark : SampleFlags.ReplacedBright;
            }
        }
    }

    private static int Gather(Plane<T> input, Plane<SampleFlags> judged, int x, int y, Span<T> sound)
    {
        for (int radius = 1; radius <= LargestRadius; radius++)
        {
            int count = 0;
            for (int j = y - radius; j <= y + radius; j++)
            {
                int row = Reflection.Index(j, input.Height);
                for (int i = x - radius; i <= x + radius; i++)
                {
                    int column = Reflection.Index(i, input.Width);
                    if ((judged[column, row] & Unsound) == 0)
                        sound[count++] = input[column, row] + T.Zero; // no negative zeros, as in windows
                }
            }

            if (count >= LeastCount)
                return count;
        }

        return 0;
    }
}
