namespace Stacks.Abstractions;

/// <summary>Whether a filter decides about single pixels or rewrites the plane.</summary>
public enum FilterKind
{
    /// <summary>
    /// Returns decisions: replacement values and a change mask. The pipeline keeps the stored bits of all other pixels.
    /// </summary>
    Selective,

    /// <summary>Writes a whole plane of new values.</summary>
    Smoothing,
}

/// <summary>What a filter F promises about linear changes of the values.</summary>
public enum Equivariance
{
    /// <summary>F(a v + b; noise scaled by a) = a F(v) + b for a &gt; 0.</summary>
    Affine,

    /// <summary>F(a v) = a F(v) for a &gt; 0.</summary>
    Scale,
}

/// <summary>
/// A filter: a descriptor without type parameters. Implementations are public, stateless, and have a public
/// constructor without parameters; the catalogue finds them in plugin assemblies.
/// </summary>
public interface IFilterPlugin
{
    /// <summary>Name in recipes: lower-case words joined by hyphens.</summary>
    string Id { get; }

    /// <summary>What it does, in one line; its formula where it has one.</summary>
    string Summary { get; }

    /// <summary>Published source of the method, or <c>textbook definition</c>.</summary>
    string Source { get; }

    /// <summary>Selective or smoothing.</summary>
    FilterKind Kind { get; }

    /// <summary>Behaviour under linear changes of the values.</summary>
    Equivariance Equivariance { get; }

    /// <summary>True when <see cref="FrameContext.Noise"/> must be there.</summary>
    bool NeedsNoise { get; }

    /// <summary>The parameters, in the order in which help shows them.</summary>
    IReadOnlyList<ParameterSpec> Parameters { get; }

    /// <summary>
    /// The work types in which the filter computes exactly as documented. A frame of another work type is converted to
    /// the narrowest listed floating-point type that holds it.
    /// </summary>
    IReadOnlyList<WorkType> WorkTypes { get; }

    /// <summary>Checks the parameters against a kind of frame and resolves them.</summary>
    /// <param name="layout">The frame; one sub-lattice of it when it is a mosaic. Its pitch divides lengths in pixels.</param>
    /// <param name="workType">One of <see cref="WorkTypes"/>.</param>
    /// <param name="values">Checked values.</param>
    /// <returns>An <see cref="IFilterStep{T}"/> for the work type; safe for concurrent use by many workers.</returns>
    /// <exception cref="ParameterException">Parameters contradict each other or do not fit the frame.</exception>
    IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values);
}

/// <summary>A filter made ready for one kind of frame.</summary>
public interface IFilterStep
{
    /// <summary>Largest distance (in x or y, in samples) from which a sample can influence a result; null for the whole frame.</summary>
    int? Reach { get; }

    /// <summary>Bytes of scratch that one call of Apply rents, beside input, output and flags.</summary>
    long ScratchBytes { get; }

    /// <summary>The parameters as they take effect.</summary>
    IReadOnlyList<ResolvedParameter> Resolved { get; }
}

/// <summary>The working part of a step.</summary>
/// <typeparam name="T">ushort, short, float or double, by <see cref="WorkType"/>.</typeparam>
public interface IFilterStep<T> : IFilterStep
    where T : unmanaged
{
    /// <summary>
    /// Filters one frame. A selective step sets Replaced and KeptAsSource flags and writes <paramref name="output"/> at
    /// replaced pixels only; a smoothing step writes all of <paramref name="output"/>, with missing and saturated
    /// samples as in the input. The result does not depend on how many threads <see cref="FrameContext.Bands"/> uses.
    /// </summary>
    /// <param name="input">Values, not changed. Missing samples hold any value: only their flag counts.</param>
    /// <param name="flags">Missing, Saturated and Defect are set; selective steps add their decisions.</param>
    /// <param name="output">A plane of the same shape as the input, not overlapping it, with undefined content.</param>
    /// <param name="context">Noise model, scratch, threads and cancellation.</param>
    void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context);
}
