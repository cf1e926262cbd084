using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Ranks;

/// <summary>y = the type-7 quantile of the window, saturated samples included: they are at least that bright.</summary>
internal sealed class QuantileStep<T>(FrameLayout layout, int side, double probability, IReadOnlyList<ResolvedParameter> resolved)
    : WindowStep<T>(layout, side, SampleFlags.Missing, resolved)
    where T : unmanaged, INumber<T>
{
    private readonly WindowQuantiles quantiles = new(side, probability);

    /// <inheritdoc/>
    protected override void Compute(Windows<T> windows, int y, int first, Span<T> result, Span<int> counts) =>
        quantiles.Row(windows, y, first, first + result.Length, result, counts);
}
