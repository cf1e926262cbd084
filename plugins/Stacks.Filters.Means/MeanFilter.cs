using Stacks.Abstractions;

namespace Stacks.Filters.Means;

/// <summary>What the mean filters have in common: smoothing, floating point, textbook definitions.</summary>
public abstract class MeanFilter : IFilterPlugin
{
    /// <summary>Longest side of a window.</summary>
    private protected const int LongestSide = 31;

    /// <summary>The window's side.</summary>
    private protected static ParameterSpec Window { get; } = new()
    {
        Name = "window",
        Kind = ParameterKind.OddInteger,
        Unit = "px",
        Default = ParameterValue.Of(3),
        Minimum = 3,
        Maximum = LongestSide,
        Meaning = "Side of the square window",
        WhenRaised = "less noise, more blur; slower",
        WhenLowered = "less blur, more noise left",
    };

    /// <summary>What is added before a mean that needs values above 0.</summary>
    private protected static ParameterSpec Pedestal { get; } = new()
    {
        Name = "pedestal",
        Kind = ParameterKind.Number,
        Unit = "ADU",
        Default = ParameterValue.Of(0),
        Meaning = "Added to every value before and taken away after: the mean needs values above 0",
        WhenRaised = "values differ less in ratio: the result comes nearer to the arithmetic mean",
        WhenLowered = "values differ more in ratio; below 0 it takes a camera's bias away, and values must stay above 0",
    };

    /// <inheritdoc/>
    public abstract string Id { get; }

    /// <inheritdoc/>
    public abstract string Summary { get; }

    /// <inheritdoc/>
    public string Source => "textbook definition";

    /// <inheritdoc/>
    public FilterKind Kind => FilterKind.Smoothing;

    /// <inheritdoc/>
    public virtual Equivariance Equivariance => Equivariance.Affine;

    /// <inheritdoc/>
    public bool NeedsNoise => false;

    /// <inheritdoc/>
    public abstract IReadOnlyList<ParameterSpec> Parameters { get; }

    /// <inheritdoc/>
    public IReadOnlyList<WorkType> WorkTypes { get; } = [WorkType.Float32, WorkType.Float64];

    /// <inheritdoc/>
    public abstract IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values);

    /// <summary>A step over equally weighted square windows of the side <see cref="Window"/>.</summary>
    private protected IFilterStep OverWindow(FrameLayout layout, WorkType workType, ParameterValues values, Mean mean)
    {
        int side = values.Integer(Window.Name);
        double[] weights = new double[side * side];
        Array.Fill(weights, 1);
        return Over(layout, workType, mean, weights, values);
    }

    /// <summary>A step over weighted square windows.</summary>
    private protected IFilterStep Over(FrameLayout layout, WorkType workType, Mean mean, double[] weights, ParameterValues values)
    {
        ResolvedParameter[] resolved = [.. Parameters.Select(p => new ResolvedParameter(p.Name, Resolve(layout, p, values[p.Name]), p.Unit))];
        double pedestal = Parameters.Contains(Pedestal) ? values.Number(Pedestal.Name) : 0;
        return workType == WorkType.Float64
            ? new MeanStep<double>(layout, Id, mean, weights, pedestal, resolved)
            : new MeanStep<float>(layout, Id, mean, weights, pedestal, resolved);
    }

    /// <summary>A parameter as it takes effect.</summary>
    private protected virtual string Resolve(FrameLayout layout, ParameterSpec spec, ParameterValue value) => value.ToString();
}
