using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Filters.Means;

/// <summary>
/// y = sum w v / sum w over the window: weights of one's own, k * k numbers row after row. They lie on the image as
/// written (correlation), and are normalised over the samples that take part.
/// </summary>
public sealed class WeightedMeanFilter : MeanFilter
{
    private static readonly ParameterSpec Weights = new()
    {
        Name = "weights",
        Kind = ParameterKind.Numbers,
        Minimum = 0,
        Maximum = 1e9,
        Meaning = "Weights of the window's samples, row after row: 9, 25, 49 ... numbers; only their ratios count",
        WhenRaised = "the samples with raised weights count more",
        WhenLowered = "the samples with lowered weights count less; 0 leaves them out",
    };

    /// <inheritdoc/>
    public override string Id => "weighted-mean";

    /// <inheritdoc/>
    public override string Summary => "y = sum w v / sum w over the window; common practice for Gaussian noise, keeping more detail than equal weights";

    /// <inheritdoc/>
    public override IReadOnlyList<ParameterSpec> Parameters { get; } = [Weights];

    /// <inheritdoc/>
    public override IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values)
    {
        double[] weights = [.. values[Weights.Name].Numbers];
        int side = (int)Math.Round(Math.Sqrt(weights.Length));
        if (side * side != weights.Length || side % 2 == 0 || side is < 3 or > LongestSide)
        {
            throw new ParameterException(
                Weights.Name,
                string.Create(CultureInfo.InvariantCulture, $"{weights.Length} numbers do not fill a square window with an odd side of 3 to {LongestSide}"),
                "give 9, 25, 49 ... numbers, row after row");
        }

        return weights.Sum() > 0
            ? Over(layout, workType, new Mean(), weights, values)
            : throw new ParameterException(Weights.Name, "all weights are 0", "give at least one weight above 0");
    }
}
