using System.Numerics;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// Mean over a frame of the gradient magnitude of T by central differences,
/// sqrt(((T(x+1,y) - T(x-1,y)) / 2)^2 + ((T(x,y+1) - T(x,y-1)) / 2)^2), over pixels whose four neighbours take part; 0
/// when there are none. As a range sigma it is a rule of thumb (common practice).
/// </summary>
internal static class MeanGradient
{
    /// <summary>The mean, in noise sigmas a pixel; rows are summed one by one, then added in order.</summary>
    public static double Of<T>(Plane<T> input, Plane<SampleFlags> flags, FrameContext context)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        NoiseModel noise = context.Noise!;
        Plane<double> sums = context.Scratch.Rent<double>(2, input.Height);
        sums.Samples.Clear();
        context.Bands.ForEach(input.Height, (first, end) =>
        {
            Plane<double> values = context.Scratch.Rent<double>(input.Width, 1), rows = context.Scratch.Rent<double>(input.Width, 3);
            for (int y = Math.Max(first, 1) - 1; y < Math.Min(end, input.Height - 1) + 1; y++)
            {
                // Rows of T follow one another in three places; the middle one of three is summed.
                for (int x = 0; x < input.Width; x++)
                    values[x, 0] = GuideLevels.TakesPart(flags[x, y]) ? double.CreateTruncating(input[x, y]) : 0;
                noise.StabiliseByRow(y, values.Row(0), rows.Row(y % 3));
                if (y > Math.Max(first, 1))
                    AddRow(rows.Row((y - 2) % 3), rows.Row((y - 1) % 3), rows.Row(y % 3), flags, y - 1, sums.Row(y - 1));
            }
        });

        double total = 0, count = 0;
        for (int y = 0; y < input.Height; y++)
        {
            total += sums[0, y];
            count += sums[1, y];
        }

        return count == 0 ? 0 : total / count;
    }

    private static void AddRow(
        ReadOnlySpan<double> above, ReadOnlySpan<double> here, ReadOnlySpan<double> below, Plane<SampleFlags> flags, int y, Span<double> sum)
    {
        for (int x = 1; x < here.Length - 1; x++)
        {
            if (!GuideLevels.TakesPart(flags[x - 1, y] | flags[x + 1, y] | flags[x, y - 1] | flags[x, y + 1]))
                continue;
            double alongX = (here[x + 1] - here[x - 1]) / 2, alongY = (below[x] - above[x]) / 2;
            sum[0] += Math.Sqrt((alongX * alongX) + (alongY * alongY));
            sum[1]++;
        }
    }
}
