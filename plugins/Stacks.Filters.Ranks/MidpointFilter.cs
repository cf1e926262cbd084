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
        : WindowStep<T>(layout, side, SampleFlags.Missing | SampleFlags.Saturated, resolved)
        where T : unmanaged, INumber<T>
    {
        private readonly WindowQuantiles ends = new(side, 0, 1);

        protected override void Compute(Windows<T> windows, int y, int first, Span<T> result, Span<int> counts)
        {
            int length = result.Length;
            Span<T> found = stackalloc T[2 * Block];
            ends.Row(windows, y, first, first + length, found, counts);
            for (int i = 0; i < length; i++)
                result[i] = Quantile.Between(found[i], found[length + i], 0.5);
        }
    }
}
