using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Ranks;

/// <summary>y = the type-7 quantile of the window, saturated samples included: they are at least that bright.</summary>
internal class QuantileStep<T>(FrameLayout layout, WindowQuantiles quantiles, SampleFlags without, IReadOnlyList<ResolvedParameter> resolved)
    : WindowStep<T>(layout, quantiles.Side, without, resolved)
    where T : unmanaged, INumber<T>
{
    /// <summary>The quantile of one probability.</summary>
    public QuantileStep(FrameLayout layout, int side, double probability, IReadOnlyList<ResolvedParameter> resolved)
        : this(layout, new WindowQuantiles(side, probability), SampleFlags.Missing, resolved)
    {
    }

    /// <inheritdoc/>
    protected override long BandScratchBytes => quantiles.ScratchBytes<T>();

    /// <inheritdoc/>
    protected override void Compute(ReflectedRows<T> rows, int first, int end, FramePart<T> frame, FrameContext context)
    {
        QuantileBlocks<T> blocks = quantiles.Over(rows, first, end, context.Scratch);
        while (blocks.Advance())
        {
            context.Cancellation.ThrowIfCancellationRequested();
            for (int row = 0; row < blocks.Height; row++)
            {
                int y = blocks.Y + row;
                Take(blocks, row, frame.Output.Row(y).Slice(blocks.X, blocks.Width));
                Keep(frame, blocks.X, y, blocks.Counts(row), rows.AllTakePart);
            }
        }
    }

    /// <summary>Makes the results of a block's row from its quantiles.</summary>
    protected virtual void Take(QuantileBlocks<T> blocks, int row, Span<T> results) => blocks.Values(0, row).CopyTo(results);
}
