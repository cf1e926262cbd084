namespace Stacks.Abstractions;

/// <summary>What a person needs to know about a result without any other file. Immutable.</summary>
public sealed record ProvenanceRecord
{
    /// <summary>Program name.</summary>
    public required string Program { get; init; }

    /// <summary>Program version.</summary>
    public required string Version { get; init; }

    /// <summary>When, UTC; SOURCE_DATE_EPOCH where that is set.</summary>
    public required DateTimeOffset Created { get; init; }

    /// <summary>The recipe's title; empty when it has none.</summary>
    public required string RecipeTitle { get; init; }

    /// <summary>SHA-256 of the resolved recipe, lower-case hex.</summary>
    public required string RecipeDigest { get; init; }

    /// <summary>SHA-256 over source digest, resolved recipe and plugin digests: equal work has equal digests.</summary>
    public required string WorkDigest { get; init; }

    /// <summary>File name of the source, without folder.</summary>
    public required string SourceName { get; init; }

    /// <summary>SHA-256 of the source file's bytes, lower-case hex.</summary>
    public required string SourceDigest { get; init; }

    /// <summary>The steps, in order.</summary>
    public required IReadOnlyList<ProvenanceStep> Steps { get; init; }

    /// <summary>Noise models used, one line each, with channel and origin.</summary>
    public required IReadOnlyList<string> Noise { get; init; }

    /// <summary>Sums over all frames.</summary>
    public required RunTotals Totals { get; init; }

    /// <summary>Sentences the reader must see: warnings, and what no longer holds (header gain after smoothing).</summary>
    public required IReadOnlyList<string> Remarks { get; init; }
}

/// <summary>One step as it took effect.</summary>
/// <param name="Filter">Filter id.</param>
/// <param name="Plugin">Plugin assembly name.</param>
/// <param name="Version">Plugin version.</param>
/// <param name="PluginDigest">SHA-256 of the plugin file, lower-case hex.</param>
/// <param name="Channel">Channel the step is limited to; null for all.</param>
/// <param name="Parameters">Resolved parameters with units.</param>
public sealed record ProvenanceStep(
    string Filter, string Plugin, string Version, string PluginDigest, string? Channel, IReadOnlyList<ResolvedParameter> Parameters);

/// <summary>Sums over all frames. Fluxes in value units.</summary>
/// <param name="Frames">Frames written.</param>
/// <param name="ReplacedBright">Pixels replaced that stood above their surroundings.</param>
/// <param name="ReplacedDark">Pixels replaced that stood below.</param>
/// <param name="KeptAsSource">Candidates the optical bound kept.</param>
/// <param name="Saturated">Saturated samples.</param>
/// <param name="Missing">Missing samples.</param>
/// <param name="FluxIn">Sum of valid input values.</param>
/// <param name="FluxRemoved">Sum of input minus output over valid samples: impulses of selective steps, sum(v - y) of smoothing ones.</param>
/// <param name="FluxOut">Sum of valid output values.</param>
public sealed record RunTotals(
    int Frames,
    long ReplacedBright,
    long ReplacedDark,
    long KeptAsSource,
    long Saturated,
    long Missing,
    double FluxIn,
    double FluxRemoved,
    double FluxOut);

/// <summary>Conditions of a frame that its ledger row names.</summary>
[Flags]
public enum LedgerFlags
{
    /// <summary>Nothing to remark.</summary>
    None = 0,

    /// <summary>Measured noise and noise model differ by more than a factor 1.5.</summary>
    NoiseDisagrees = 1,

    /// <summary>The noise could not be measured (too few valid samples).</summary>
    NoiseNotMeasurable = 2,

    /// <summary>A smoothing result left the range of the integer output type and was held at its end.</summary>
    OutOfRange = 4,
}

/// <summary>
/// The ledger's account of one frame. No times in it: equal inputs give equal ledgers. Levels, noise and flux are in
/// value units.
/// </summary>
public sealed record LedgerRow
{
    /// <summary>Index of the frame, from 0.</summary>
    public required int Frame { get; init; }

    /// <summary>SHA-256 over the source's decoded stored samples, little-endian; 32 bytes.</summary>
    public required byte[] SourceDigest { get; init; }

    /// <summary>SHA-256 over the result's stored samples, little-endian; 32 bytes.</summary>
    public required byte[] ResultDigest { get; init; }

    /// <summary>Median of the valid input samples.</summary>
    public required double Level { get; init; }

    /// <summary>Noise sigma measured on the input; NaN when not measurable.</summary>
    public required double NoiseBefore { get; init; }

    /// <summary>Noise sigma measured on the result; NaN when not measurable.</summary>
    public required double NoiseAfter { get; init; }

    /// <summary>Pixels replaced that stood above their surroundings.</summary>
    public required long ReplacedBright { get; init; }

    /// <summary>Pixels replaced that stood below.</summary>
    public required long ReplacedDark { get; init; }

    /// <summary>Candidates the optical bound kept.</summary>
    public required long KeptAsSource { get; init; }

    /// <summary>Saturated samples.</summary>
    public required long Saturated { get; init; }

    /// <summary>Missing samples.</summary>
    public required long Missing { get; init; }

    /// <summary>Sum of valid input values.</summary>
    public required double FluxIn { get; init; }

    /// <summary>Sum of input minus output over valid samples.</summary>
    public required double FluxRemoved { get; init; }

    /// <summary>Sum of valid output values.</summary>
    public required double FluxOut { get; init; }

    /// <summary>Remarks.</summary>
    public required LedgerFlags Flags { get; init; }
}
