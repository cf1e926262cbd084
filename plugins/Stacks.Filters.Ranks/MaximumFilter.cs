using Stacks.Abstractions;

namespace Stacks.Filters.Ranks;

/// <summary>y = max v: the highest sample of the window. Brightens.</summary>
public sealed class MaximumFilter : RankFilter
{
    /// <inheritdoc/>
    public override string Id => "maximum";

    /// <inheritdoc/>
    public override string Summary => "y = the highest sample of the window; brightens";

    private protected override WindowStep<T> Prepare<T>(FrameLayout layout, ParameterValues values) =>
        new QuantileStep<T>(layout, values.Integer(Window.Name), 1, Resolve(values));
}
