using Stacks.Abstractions;

namespace Stacks.Filters.Means;

/// <summary>y = n / sum(1/v) over the window, v &gt; 0. Common practice for bright impulses over additive noise.</summary>
public sealed class HarmonicMeanFilter : MeanFilter
{
    /// <inheritdoc/>
    public override string Id => "harmonic-mean";

    /// <inheritdoc/>
    public override string Summary =>
        "y = n / sum(1/v) over the window, v > 0; common practice for bright impulses over additive noise; dark ones spread";

    /// <inheritdoc/>
    public override Equivariance Equivariance => Equivariance.Scale;

    /// <inheritdoc/>
    public override IReadOnlyList<ParameterSpec> Parameters { get; } = [Window, Pedestal];

    /// <inheritdoc/>
    public override IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values) =>
        OverWindow(layout, workType, values, new Harmonic());

    /// <summary>1 / (1/u + D) - u.</summary>
    private sealed class Harmonic : Mean
    {
        public override bool NeedsPositive => true;

        public override double Term(double u) => 1 / u;

        public override double Change(double u, double departure) => -u * u * departure / (1 + (u * departure));
    }
}
