using Stacks.Abstractions;

namespace Stacks.Filters.Means;

/// <summary>
/// y = sum v^(Q+1) / sum v^Q over the window, v &gt; 0: the mean of v with weights v^Q. Common practice: Q above 0
/// against dark impulses, below 0 against bright ones; Q = 0 is the arithmetic, -1 the harmonic mean.
/// </summary>
public sealed class ContraharmonicMeanFilter : MeanFilter
{
    private static readonly ParameterSpec Order = new()
    {
        Name = "order",
        Kind = ParameterKind.Number,
        Minimum = -10,
        Maximum = 10,
        Meaning = "Q: 0 is the arithmetic mean, -1 the harmonic mean",
        WhenRaised = "brighter samples count more: above 0 it removes dark impulses and spreads bright ones",
        WhenLowered = "darker samples count more: below 0 it removes bright impulses and spreads dark ones",
    };

    /// <inheritdoc/>
    public override string Id => "contraharmonic-mean";

    /// <inheritdoc/>
    public override string Summary =>
        "y = sum v^(Q+1) / sum v^Q over the window, v > 0; common practice for impulses of one kind: Q > 0 for dark, Q < 0 for bright ones";

    /// <inheritdoc/>
    public override Equivariance Equivariance => Equivariance.Scale;

    /// <inheritdoc/>
    public override IReadOnlyList<ParameterSpec> Parameters { get; } = [Window, Order, Pedestal];

    /// <inheritdoc/>
    public override IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values) =>
        OverWindow(layout, workType, values, new Contraharmonic(values.Number(Order.Name)));

    /// <summary>Mean with mass u^Q.</summary>
    private sealed class Contraharmonic(double order) : Mean
    {
        public override bool NeedsPositive => true;

        public override double Mass(double u) => Math.Pow(u, order);
    }
}
