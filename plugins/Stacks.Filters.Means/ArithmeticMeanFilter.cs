using Stacks.Abstractions;

namespace Stacks.Filters.Means;

/// <summary>y = sum v / n over the window. Common practice for Gaussian noise where detail does not matter.</summary>
public sealed class ArithmeticMeanFilter : MeanFilter
{
    /// <inheritdoc/>
    public override string Id => "arithmetic-mean";

    /// <inheritdoc/>
    public override string Summary => "y = sum v / n over the window; common practice for Gaussian noise; blurs edges";

    /// <inheritdoc/>
    public override IReadOnlyList<ParameterSpec> Parameters { get; } = [Window];

    /// <inheritdoc/>
    public override IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values)
    {
        int side = values.Integer(Window.Name);
        ResolvedParameter[] resolved = [new(Window.Name, values[Window.Name].ToString(), Window.Unit)];
        return workType == WorkType.Float64 ? new ArithmeticMeanStep<double>(side, resolved) : new ArithmeticMeanStep<float>(side, resolved);
    }
}
