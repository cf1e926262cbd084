using System.Globalization;
using System.Numerics;
using Stacks.Abstractions;

namespace Stacks.Filters.Ranks;

/// <summary>What the rank filters have in common: a window, smoothing, textbook definitions.</summary>
public abstract class RankFilter : IFilterPlugin
{
    /// <summary>The window's side.</summary>
    private protected static ParameterSpec Window { get; } = new()
    {
        Name = "window",
        Kind = ParameterKind.OddInteger,
        Unit = "px",
        Default = ParameterValue.Of(3),
        Minimum = 3,
        Maximum = 31,
        Meaning = "Side of the square window",
        WhenRaised = "larger structures are flattened; slower",
        WhenLowered = "finer structures survive, and so does more noise",
    };

    /// <inheritdoc/>
    public abstract string Id { get; }

    /// <inheritdoc/>
    public abstract string Summary { get; }

    /// <inheritdoc/>
    public virtual string Source => "textbook definition";

    /// <inheritdoc/>
    public FilterKind Kind => FilterKind.Smoothing;

    /// <inheritdoc/>
    public Equivariance Equivariance => Equivariance.Affine;

    /// <inheritdoc/>
    public bool NeedsNoise => false;

    /// <inheritdoc/>
    public virtual IReadOnlyList<ParameterSpec> Parameters { get; } = [Window];

    /// <inheritdoc/>
    public virtual IReadOnlyList<WorkType> WorkTypes { get; } = [WorkType.UInt16, WorkType.Int16, WorkType.Float32, WorkType.Float64];

    /// <inheritdoc/>
    public IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values) => workType switch
    {
        WorkType.UInt16 => Prepare<ushort>(layout, values),
        WorkType.Int16 => Prepare<short>(layout, values),
        WorkType.Float32 => Prepare<float>(layout, values),
        _ => Prepare<double>(layout, values),
    };

    /// <summary>The step for one sample type.</summary>
    private protected abstract WindowStep<T> Prepare<T>(FrameLayout layout, ParameterValues values)
        where T : unmanaged, INumber<T>;

    /// <summary>The parameters as they take effect: as given.</summary>
    private protected IReadOnlyList<ResolvedParameter> Resolve(ParameterValues values) =>
        [.. Parameters.Select(spec => new ResolvedParameter(
            spec.Name, values.Number(spec.Name).ToString("R", CultureInfo.InvariantCulture), spec.Unit))];
}
