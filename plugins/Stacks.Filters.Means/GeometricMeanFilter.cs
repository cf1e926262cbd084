using Stacks.Abstractions;

namespace Stacks.Filters.Means;

/// <summary>y = exp(mean ln v) over the window, v &gt; 0. Common practice for multiplicative noise.</summary>
public sealed class GeometricMeanFilter : MeanFilter
{
    /// <inheritdoc/>
    public override string Id => "geometric-mean";

    /// <inheritdoc/>
    public override string Summary => "y = exp(mean ln v) over the window, v > 0; common practice for multiplicative noise";

    /// <inheritdoc/>
    public override Equivariance Equivariance => Equivariance.Scale;

    /// <inheritdoc/>
    public override IReadOnlyList<ParameterSpec> Parameters { get; } = [Window, Pedestal];

    /// <inheritdoc/>
    public override IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values) =>
        OverWindow(layout, workType, values, new Geometric());

    /// <summary>exp(ln u + D) - u.</summary>
    private sealed class Geometric : Mean
    {
        public override bool NeedsPositive => true;

        public override double Term(double u) => Math.Log(u);

        public override double Change(double u, double departure) => u * (Math.Exp(departure) - 1);
    }
}
