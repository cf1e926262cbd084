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
    public static double Of(SpatialKernel kernel, GuidedPlanes planes, FrameContext context)
    {
        Plane<double> sums = context.Scratch.Rent<double>(2, kernel.Height);
        sums.Samples.Clear();
        context.Bands.ForEach(kernel.Height, (first, end) =>
        {
            for (int y = Math.Max(first, 1); y < Math.Min(end, kernel.Height - 1); y++)
            {
                ReadOnlySpan<double> above = planes.Inner(planes.Guide, y - 1), here = planes.Inner(planes.Guide, y);
                ReadOnlySpan<double> below = planes.Inner(planes.Guide, y + 1), valid = planes.Inner(planes.Factors, y);
                ReadOnlySpan<double> validAbove = planes.Inner(planes.Factors, y - 1), validBelow = planes.Inner(planes.Factors, y + 1);
                Span<double> sum = sums.Row(y);
                for (int x = 1; x < here.Length - 1; x++)
                {
                    if (valid[x - 1] * valid[x + 1] * validAbove[x] * validBelow[x] == 0)
                        continue;
                    double alongX = (here[x + 1] - here[x - 1]) / 2, alongY = (below[x] - above[x]) / 2;
                    sum[0] += Math.Sqrt((alongX * alongX) + (alongY * alongY));
                    sum[1]++;
                }
            }
        });

        double total = 0, count = 0;
        for (int y = 0; y < kernel.Height; y++)
        {
            total += sums[0, y];
            count += sums[1, y];
        }

        return count == 0 ? 0 : total / count;
    }
}
