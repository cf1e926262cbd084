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
    public long ScratchBytes =>
        ReflectedRows.ScratchBytes(layout.Width, layout.Height, quartiles.Side / 2) + quartiles.ScratchBytes<T>();

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved { get; }

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        NoiseModel noise = context.Noise ?? throw new InvalidOperationException("local statistics need a noise model");
        ReflectedRows<T> rows = new(input, flags, SampleFlags.Missing, quartiles.Side / 2, context.Scratch);
        context.Bands.ForEach(input.Height, (first, end) =>
        {
            QuantileBlocks<T> blocks = quartiles.Over(rows, first, end, context.Scratch);
            while (blocks.Advance())
            {
                context.Cancellation.ThrowIfCancellationRequested();
                for (int row = 0; row < blocks.Height; row++)
                {
                    int y = blocks.Y + row;
                    ReadOnlySpan<T> lower = blocks.Values(0, row), middle = blocks.Values(1, row), upper = blocks.Values(2, row);
                    ReadOnlySpan<ushort> counts = blocks.Counts(row);
                    for (int i = 0; i < blocks.Width; i++)
                    {
                        int x = blocks.X + i;
                        if ((flags[x, y] & (SampleFlags.Missing | SampleFlags.Saturated)) != 0 || counts[i] < Shrinkage.LeastCount)
                        {
                            output[x, y] = input[x, y];
                            continue;
                        }

                        double median = double.CreateTruncating(middle[i]);
                        double sigma = (double.CreateTruncating(upper[i]) - double.CreateTruncating(lower[i])) / unitRange[counts[i]];
                        output[x, y] = T.CreateTruncating(Shrinkage.Of(
                            double.CreateTruncating(input[x, y]), median, noise.Variance(x, y, median), sigma * sigma));
                    }
                }
            }
        });
    }
}
