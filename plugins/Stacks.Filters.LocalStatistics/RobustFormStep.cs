using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.LocalStatistics;

/// <summary>
/// Local median for the mean and (IQR / c(n))^2 for the local variance, n the samples that take part. Saturated samples
/// take part: they are at least that bright.
/// </summary>
internal sealed class RobustFormStep<T> : IFilterStep<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const int Block = 64;

    private readonly FrameLayout layout;
    private readonly WindowQuantiles quartiles;
    private readonly double[] unitRange;

    /// <summary>A step for one kind of frame.</summary>
    public RobustFormStep(FrameLayout layout, int side, IReadOnlyList<ResolvedParameter> resolved)
    {
        this.layout = layout;
        quartiles = new WindowQuantiles(side, 0.25, 0.5, 0.75);
        unitRange = [0, .. Enumerable.Range(1, side * side).Select(NormalOrderStatistics.InterquartileRange)];
        Resolved = resolved;
    }

    /// <inheritdoc/>
    public int? Reach => quartiles.Side / 2;

    /// <inheritdoc/>
    public long ScratchBytes => Windows.ScratchBytes<T>(layout.Width, layout.Height, quartiles.Side / 2);

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved { get; }

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        NoiseModel noise = context.Noise ?? throw new InvalidOperationException("local statistics need a noise model");
        Windows<T> windows = Windows.Of(input, flags, SampleFlags.Missing, quartiles.Side / 2, context.Scratch, context.Bands);
        context.Bands.ForEach(input.Height, (first, end) =>
        {
            Span<T> found = stackalloc T[3 * Block];
            Span<int> counts = stackalloc int[Block];
            for (int y = first; y < end; y++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                for (int start = 0; start < input.Width; start += Block)
                {
                    int length = Math.Min(Block, input.Width - start);
                    quartiles.Row(windows, y, start, start + length, found, counts);
                    for (int i = 0; i < length; i++)
                    {
                        int x = start + i;
                        if ((flags[x, y] & (SampleFlags.Missing | SampleFlags.Saturated)) != 0 || counts[i] < Shrinkage.LeastCount)
                        {
                            output[x, y] = input[x, y];
                            continue;
                        }

                        double median = double.CreateTruncating(found[length + i]);
                        double range = double.CreateTruncating(found[(2 * length) + i]) - double.CreateTruncating(found[i]);
                        double sigma = range / unitRange[counts[i]];
                        output[x, y] = T.CreateTruncating(Shrinkage.Of(
                            double.CreateTruncating(input[x, y]), median, noise.Variance(x, y, median), sigma * sigma));
                    }
                }
            }
        });
    }
}
