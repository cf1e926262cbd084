using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>A plugin assembly as loaded, for provenance.</summary>
/// <param name="Assembly">Simple assembly name.</param>
/// <param name="Version">Its version.</param>
/// <param name="Path">File it was loaded from.</param>
/// <param name="Digest">SHA-256 of that file, lower-case hex.</param>
public sealed record PluginOrigin(string Assembly, string Version, string Path, string Digest);

/// <summary>A filter in the catalogue.</summary>
/// <param name="Plugin">The filter.</param>
/// <param name="Origin">Where it comes from.</param>
public sealed record CatalogueFilter(IFilterPlugin Plugin, PluginOrigin Origin);

/// <summary>A step with checked parameters.</summary>
/// <param name="Filter">The filter.</param>
/// <param name="Values">Checked values.</param>
/// <param name="Section">The recipe's table, for its channel and for places in errors.</param>
public sealed record PlannedStep(CatalogueFilter Filter, ParameterValues Values, StepSection Section)
{
    /// <summary>True when the step applies to a frame's channel.</summary>
    public bool AppliesTo(FrameLayout layout) => ChannelSelector.Matches(Section.Channel, layout);
}

/// <summary>Matches the <c>channel</c> key of a step or noise table with a frame.</summary>
public static class ChannelSelector
{
    /// <summary>True when <paramref name="channel"/> is null, the frame's channel index, or its channel name.</summary>
    public static bool Matches(string? channel, FrameLayout layout) =>
        channel is null
        || channel == layout.ChannelName
        || channel == (layout.Channel ?? 0).ToString(System.Globalization.CultureInfo.InvariantCulture);

    /// <summary>The channel as a recipe may name it: its name, else its index.</summary>
    public static string NameOf(FrameLayout layout) =>
        layout.ChannelName ?? (layout.Channel ?? 0).ToString(System.Globalization.CultureInfo.InvariantCulture);
}

/// <summary>Everything about one stack's run, resolved before it starts. The run adds nothing of its own.</summary>
public sealed record RunPlan : IDisposable
{
    /// <summary>The input, open. The run does not dispose it; the plan does.</summary>
    public required IStackReader Reader { get; init; }

    /// <summary>The recipe.</summary>
    public required Recipe Recipe { get; init; }

    /// <summary>SHA-256 of the resolved recipe (independent of comments and layout of the file), lower-case hex.</summary>
    public required string RecipeDigest { get; init; }

    /// <summary>The steps, in order.</summary>
    public required IReadOnlyList<PlannedStep> Steps { get; init; }

    /// <summary>Final path of the output.</summary>
    public required string OutputPath { get; init; }

    /// <summary>Format of the output.</summary>
    public required IStackFormat OutputFormat { get; init; }

    /// <summary>Origin of the output format's plugin and of the input format's, for the work digest.</summary>
    public required IReadOnlyList<PluginOrigin> FormatOrigins { get; init; }

    /// <summary>Write the change mask.</summary>
    public required bool WriteMask { get; init; }

    /// <summary>Workers, 1 or more.</summary>
    public required int Workers { get; init; }

    /// <summary>Frames in flight, 1 or more; lowered to fit the memory limit.</summary>
    public required int FramesInFlight { get; init; }

    /// <summary>Replace an output that does not match.</summary>
    public required bool Overwrite { get; init; }

    /// <summary>
    /// Opens a stack by path through the catalogue, for the recipe's mask and defect images; the run disposes what it
    /// returns. Null only where the recipe names neither.
    /// </summary>
    public Func<string, IStackReader>? OpenStack { get; init; }

    /// <summary>The kinds of frame in the stack with their prepared steps, for plans and reports; empty in plans made by hand.</summary>
    public IReadOnlyList<FrameKind> Kinds { get; init; } = [];

    /// <summary>Memory that the run needs; null in plans made by hand.</summary>
    public MemoryNeed? Memory { get; init; }

    /// <summary>The noise table for a frame: the one that names its channel, else the one for all; null when there is neither.</summary>
    public NoiseSection? NoiseSectionOf(FrameLayout layout) =>
        Recipe.Noise.FirstOrDefault(n => n.Channel is not null && ChannelSelector.Matches(n.Channel, layout))
        ?? Recipe.Noise.FirstOrDefault(n => n.Channel is null);

    /// <summary>Closes the input.</summary>
    public void Dispose() => Reader.Dispose();

    /// <summary>The frame's layout with the recipe's mosaic and saturation applied.</summary>
    public FrameLayout LayoutOf(int frame)
    {
        FrameLayout layout = Reader.Layout(frame);
        if (Recipe.Input.Mosaic is { } lattice && lattice != layout.Lattice)
            layout = layout with { Lattice = lattice };
        if (Recipe.Input.Saturation is { } value)
            layout = layout with { SaturationStored = layout.Transform.ToStored(value) };
        return layout;
    }

    /// <summary>The sample type a frame's result is written in ("auto" keeps the type unless a smoothing step applies).</summary>
    public SampleType OutputTypeOf(FrameLayout layout)
    {
        bool smoothed = Steps.Any(s => s.Filter.Plugin.Kind == FilterKind.Smoothing && s.AppliesTo(layout));
        return Recipe.Output.Samples switch
        {
            SampleChoice.Same => layout.SampleType,
            SampleChoice.Float32 => SampleType.Float32,
            SampleChoice.Float64 => SampleType.Float64,
            _ when !smoothed => layout.SampleType,
            _ => layout.SampleType is SampleType.UInt32 or SampleType.Int32 or SampleType.UInt64 or SampleType.Int64 or SampleType.Float64
                ? SampleType.Float64
                : SampleType.Float32,
        };
    }
}

/// <summary>How far a run is.</summary>
/// <param name="FramesDone">Frames written.</param>
/// <param name="FrameCount">Frames in all.</param>
public readonly record struct RunProgress(int FramesDone, int FrameCount);

/// <summary>How a stack's run ended.</summary>
public enum RunOutcome
{
    /// <summary>The output was made.</summary>
    Made,

    /// <summary>The output was there already and matches input, recipe and plugins.</summary>
    AlreadyDone,

    /// <summary>The input is a file of an earlier input's stack, and its frames are in that one's output.</summary>
    PartOfAnother,
}

/// <summary>The result of one stack's run.</summary>
/// <param name="Outcome">How it ended.</param>
/// <param name="Provenance">The provenance written; null when the output was already done.</param>
/// <param name="Files">Final paths of all files made, the stack first.</param>
/// <param name="Warnings">Sentences for the user, each with its frame where it has one.</param>
public sealed record RunResult(
    RunOutcome Outcome, ProvenanceRecord? Provenance, IReadOnlyList<string> Files, IReadOnlyList<string> Warnings)
{
    /// <summary>A row per frame, in order; empty when the output was already done.</summary>
    public IReadOnlyList<LedgerRow> Ledger { get; init; } = [];
}
