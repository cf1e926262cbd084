using Stacks.Abstractions;

namespace Stacks.Filters.Ranks;

/// <summary>y = min v: the lowest sample of the window. Darkens.</summary>
public sealed class MinimumFilter : RankFilter
{
    /// <inheritdoc/>
    public override string Id => "minimum";

    /// <inheritdoc/>
    public override string Summary => "y = the lowest sample of the window; darkens";

    private protected override WindowStep<T> Prepare<T>(FrameLayout layout, ParameterValues values) =>
        new QuantileStep<T>(layout, values.Integer(Window.Name), 0, Resolve(values));
}
