using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Ranks;

/// <summary>
/// y = (min v + max v) / 2 over the window. For uniform noise; thickens edges (common practice). An average: saturated
/// samples take no part.
/// </summary>
public sealed class MidpointFilter : RankFilter
{
    /// <inheritdoc/>
    public override string Id => "midpoint";

    /// <inheritdoc/>
    public override string Summary => "y = (lowest + highest) / 2 of the window; common practice for uniform noise; thickens edges";

    /// <inheritdoc/>
    public override IReadOnlyList<WorkType> WorkTypes { get; } = [WorkType.Float32, WorkType.Float64];

    private protected override WindowStep<T> Prepare<T>(FrameLayout layout, ParameterValues values) =>
        new Step<T>(layout, values.Integer(Window.Name), Resolve(values));

    private sealed class Step<T>(FrameLayout layout, int side, IReadOnlyList<ResolvedParameter> resolved)
        : QuantileStep<T>(layout, new WindowQuantiles(side, 0, 1), SampleFlags.Missing | SampleFlags.Saturated, resolved)
        where T : unmanaged, INumber<T>
    {
        protected override void Take(QuantileBlocks<T> blocks, int row, Span<T> results)
        {
            ReadOnlySpan<T> lowest = blocks.Values(0, row), highest = blocks.Values(1, row);
            for (int i = 0; i < results.Length; i++)
                results[i] = Quantile.Between(lowest[i], highest[i], 0.5);
        }
    }
}
