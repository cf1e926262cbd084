using Stacks.Abstractions;

namespace Stacks.Filters.Ranks;

/// <summary>
/// y = the sample below which a share of the window lies: the type-7 quantile, between ranks on a straight line, hence
/// in floating point.
/// </summary>
public sealed class PercentileFilter : RankFilter
{
    private static readonly ParameterSpec Percentile = new()
    {
        Name = "percentile",
        Kind = ParameterKind.Number,
        Unit = "%",
        Minimum = 0,
        Maximum = 100,
        Meaning = "Share of the window's samples that lie below the result: 0 is the minimum, 50 the median, 100 the maximum",
        WhenRaised = "brightens",
        WhenLowered = "darkens",
    };

    /// <inheritdoc/>
    public override string Id => "percentile";

    /// <inheritdoc/>
    public override string Summary => "y = the given percentile of the window; between ranks on a straight line";

    /// <inheritdoc/>
    public override string Source => "type 7 of Hyndman and Fan, The American Statistician 50 (1996) 361";

    /// <inheritdoc/>
    public override IReadOnlyList<ParameterSpec> Parameters { get; } = [Window, Percentile];

    /// <inheritdoc/>
    public override IReadOnlyList<WorkType> WorkTypes { get; } = [WorkType.Float32, WorkType.Float64];

    private protected override WindowStep<T> Prepare<T>(FrameLayout layout, ParameterValues values) =>
        new QuantileStep<T>(layout, values.Integer(Window.Name), values.Number(Percentile.Name) / 100, Resolve(values));
}
