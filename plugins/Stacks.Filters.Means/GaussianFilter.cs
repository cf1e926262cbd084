using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Filters.Means;

/// <summary>y = sum w v / sum w with w = exp(-(dx^2 + dy^2) / 2 sigma^2), cut at 4 sigma along x and y.</summary>
public sealed class GaussianFilter : MeanFilter
{
    private static readonly ParameterSpec Sigma = new()
    {
        Name = "sigma",
        Kind = ParameterKind.Number,
        Unit = "px",
        Default = ParameterValue.Of(1),
        Minimum = 0.25,
        Maximum = 10,
        Meaning = "Standard deviation of the Gaussian",
        WhenRaised = "less noise, more blur; time grows with its square",
        WhenLowered = "less blur, more noise left",
    };

    /// <inheritdoc/>
    public override string Id => "gaussian";

    /// <inheritdoc/>
    public override string Summary =>
        "y = sum w v / sum w, w = exp(-(dx^2 + dy^2) / 2 sigma^2); common practice for Gaussian noise, and as a matched filter for point sources";

    /// <inheritdoc/>
    public override IReadOnlyList<ParameterSpec> Parameters { get; } = [Sigma];

    /// <inheritdoc/>
    public override IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values) =>
        Over(layout, workType, new Mean(), Weights(values.Number(Sigma.Name) / layout.Pitch), values);

    private protected override string Resolve(FrameLayout layout, ParameterSpec spec, ParameterValue value) =>
        (value.Number / layout.Pitch).ToString("R", CultureInfo.InvariantCulture);

    private static double[] Weights(double sigma)
    {
        int radius = (int)Math.Floor(4 * sigma), side = (2 * radius) + 1;
        double[] weights = new double[side * side];
        for (int i = 0; i < weights.Length; i++)
        {
            double dx = (i % side) - radius, dy = (i / side) - radius;
            weights[i] = Math.Exp(-((dx * dx) + (dy * dy)) / (2 * sigma * sigma));
        }

        return weights;
    }
}
