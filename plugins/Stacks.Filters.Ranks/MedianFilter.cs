using Stacks.Abstractions;

namespace Stacks.Filters.Ranks;

/// <summary>y = median v: the middle sample of the window. Against impulses (common practice).</summary>
public sealed class MedianFilter : RankFilter
{
    /// <inheritdoc/>
    public override string Id => "median";

    /// <inheritdoc/>
    public override string Summary => "y = the middle sample of the window; common practice against impulses";

    private protected override WindowStep<T> Prepare<T>(FrameLayout layout, ParameterValues values) =>
        new QuantileStep<T>(layout, values.Integer(Window.Name), 0.5, Resolve(values));
}
