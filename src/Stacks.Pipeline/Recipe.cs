using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>A place in a recipe file.</summary>
/// <param name="File">Path as given.</param>
/// <param name="Line">From 1.</param>
/// <param name="Column">From 1.</param>
public readonly record struct RecipePlace(string File, int Line, int Column)
{
    /// <summary><c>file:line:column</c>.</summary>
    public override string ToString() => $"{File}:{Line}:{Column}";
}

/// <summary>A recipe as read and checked for keys and kinds; filters and files are resolved by the plan.</summary>
public sealed record Recipe
{
    /// <summary>Path as given.</summary>
    public required string Path { get; init; }

    /// <summary>Title; empty when there is none.</summary>
    public string Title { get; init; } = "";

    /// <summary>The <c>[input]</c> table.</summary>
    public InputSection Input { get; init; } = new();

    /// <summary>The <c>[noise]</c> table, or the <c>[[noise]]</c> tables, in order.</summary>
    public IReadOnlyList<NoiseSection> Noise { get; init; } = [];

    /// <summary>The <c>[[step]]</c> tables, in order; may be empty.</summary>
    public IReadOnlyList<StepSection> Steps { get; init; } = [];

    /// <summary>The <c>[output]</c> table.</summary>
    public OutputSection Output { get; init; } = new();
}

/// <summary>The <c>[input]</c> table.</summary>
public sealed record InputSection
{
    /// <summary>Null to take the header's word; else the mosaic's period (1 x 1 for <c>"none"</c>).</summary>
    public Lattice? Mosaic { get; init; }

    /// <summary>Path of a mask (non-zero is missing), resolved against the recipe's folder; null for none.</summary>
    public string? Mask { get; init; }

    /// <summary>Path of a defect list or image (non-zero is replaced in every frame), resolved likewise; null for none.</summary>
    public string? Defects { get; init; }

    /// <summary>Names of extensions that hold science frames; null to decide by the file's conventions.</summary>
    public IReadOnlyList<string>? Extensions { get; init; }

    /// <summary>Value at or beyond which samples are saturated; null to take the header's word or the type's end.</summary>
    public double? Saturation { get; init; }
}

/// <summary>Where a noise model comes from.</summary>
public enum NoiseOrigin
{
    /// <summary>gain, read_noise, pedestal (or sigma) of the recipe.</summary>
    Values,

    /// <summary>The headers of the file.</summary>
    Header,

    /// <summary>A noise.toml that a survey wrote.</summary>
    File,

    /// <summary>A constant sigma measured on each frame.</summary>
    Frame,
}

/// <summary>One <c>[noise]</c> or <c>[[noise]]</c> table.</summary>
public sealed record NoiseSection
{
    /// <summary>Where the table stands.</summary>
    public required RecipePlace Place { get; init; }

    /// <summary>Channel index or name it is for; null for all.</summary>
    public string? Channel { get; init; }

    /// <summary>Where the model comes from.</summary>
    public required NoiseOrigin From { get; init; }

    /// <summary>Electrons per ADU.</summary>
    public double? Gain { get; init; }

    /// <summary>Electrons rms.</summary>
    public double? ReadNoise { get; init; }

    /// <summary>Level without light, ADU.</summary>
    public double? Pedestal { get; init; }

    /// <summary>Constant sigma in value units, instead of gain and read noise.</summary>
    public double? Sigma { get; init; }

    /// <summary>Path of a noise.toml, resolved against the recipe's folder.</summary>
    public string? File { get; init; }
}

/// <summary>One <c>[[step]]</c> table.</summary>
public sealed record StepSection
{
    /// <summary>Where the table stands.</summary>
    public required RecipePlace Place { get; init; }

    /// <summary>Filter id.</summary>
    public required string Filter { get; init; }

    /// <summary>Where <c>filter</c> stands.</summary>
    public RecipePlace FilterPlace { get; init; }

    /// <summary>Where <c>channel</c> stands, or the table where it is absent.</summary>
    public RecipePlace ChannelPlace { get; init; }

    /// <summary>Channel index or name the step is limited to; null for all.</summary>
    public string? Channel { get; init; }

    /// <summary>The other keys.</summary>
    public required IReadOnlyDictionary<string, ParameterValue> Parameters { get; init; }

    /// <summary>Where each key stands.</summary>
    public required IReadOnlyDictionary<string, RecipePlace> Places { get; init; }
}

/// <summary>Which sample type a result gets.</summary>
public enum SampleChoice
{
    /// <summary>The input's for selective recipes; float32 (float64 for wide types) after smoothing.</summary>
    Auto,

    /// <summary>The input's, rounded half to even.</summary>
    Same,

    /// <summary>float32.</summary>
    Float32,

    /// <summary>float64.</summary>
    Float64,
}

/// <summary>The <c>[output]</c> table.</summary>
public sealed record OutputSection
{
    /// <summary>Sample type.</summary>
    public SampleChoice Samples { get; init; }

    /// <summary>Where <c>samples</c> stands, or the table where it is absent.</summary>
    public RecipePlace SamplesPlace { get; init; }

    /// <summary>Format id; null for the input's.</summary>
    public string? Format { get; init; }

    /// <summary>Where <c>format</c> stands, or the table where it is absent.</summary>
    public RecipePlace FormatPlace { get; init; }

    /// <summary>How samples are compressed.</summary>
    public OutputCompression Compression { get; init; }

    /// <summary>Where <c>compression</c> stands, or the table where it is absent.</summary>
    public RecipePlace CompressionPlace { get; init; }

    /// <summary>Write what the source holds beside its science frames.</summary>
    public bool Carry { get; init; } = true;

    /// <summary>Write the change mask; null for the default: written when a step is selective.</summary>
    public bool? Mask { get; init; }
}
