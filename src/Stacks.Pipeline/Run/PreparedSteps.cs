using System.Collections.Concurrent;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>A step made ready for one kind of frame.</summary>
/// <param name="Number">Place among the recipe's steps, from 1.</param>
/// <param name="Planned">The plan's step.</param>
/// <param name="Type">The type it computes in.</param>
/// <param name="Step">The filter's working part.</param>
internal sealed record PreparedStep(int Number, PlannedStep Planned, WorkType Type, IFilterStep Step)
{
    /// <summary>Selective or smoothing.</summary>
    public FilterKind Kind => Planned.Filter.Plugin.Kind;

    /// <summary>True when it must have a noise model.</summary>
    public bool NeedsNoise => Planned.Filter.Plugin.NeedsNoise;
}

/// <summary>The part of a frame that a filter sees at once: the frame, or one sub-lattice of a mosaic.</summary>
/// <param name="OffsetX">Column of its first sample.</param>
/// <param name="OffsetY">Row of its first sample.</param>
/// <param name="Steps">The steps that apply, in order.</param>
internal sealed record PreparedPart(int OffsetX, int OffsetY, IReadOnlyList<PreparedStep> Steps);

/// <summary>Everything that is done alike to all frames of one kind.</summary>
/// <param name="Layout">Their layout, without z, time and extension.</param>
/// <param name="OutputType">Sample type of the result.</param>
/// <param name="Parts">One, or the sub-lattices of a mosaic.</param>
internal sealed record PreparedFrame(FrameLayout Layout, SampleType OutputType, IReadOnlyList<PreparedPart> Parts)
{
    /// <summary>True when a smoothing step applies.</summary>
    public bool IsSmoothed { get; } = Parts[0].Steps.Any(s => s.Kind == FilterKind.Smoothing);

    /// <summary>True when the result is a plane of new values, not the source with some samples replaced.</summary>
    public bool IsRewritten { get; } =
        OutputType != Layout.SampleType || Parts[0].Steps.Any(s => s.Kind == FilterKind.Smoothing);

    /// <summary>True when a step needs a noise model.</summary>
    public bool NeedsNoise { get; } = Parts[0].Steps.Any(s => s.NeedsNoise);
}

/// <summary>
/// Steps made ready once for every kind of frame. Frames of one kind differ at most in z, time and extension, on which
/// no step depends. Safe for concurrent use.
/// </summary>
internal sealed class PreparedSteps(RunPlan plan)
{
    private readonly ConcurrentDictionary<FrameLayout, PreparedFrame> known = new();

    /// <summary>The steps for a frame.</summary>
    /// <exception cref="RecipeException">A filter refuses its parameters for this kind of frame.</exception>
    /// <exception cref="StackFormatException">A frame is too large to be held in memory at once.</exception>
    public PreparedFrame For(FrameLayout layout) =>
        known.GetOrAdd(layout with { Z = null, Time = null, Extension = null }, Prepare);

    private PreparedFrame Prepare(FrameLayout layout)
    {
        SampleType outputType = plan.OutputTypeOf(layout);
        if (Math.Max(layout.StoredBytes, layout.Length * outputType.Size()) > Array.MaxLength)
        {
            throw new StackFormatException(
                plan.Reader.Path,
                $"a frame of {layout.Width} x {layout.Height} samples ({layout.SampleType.Name()}, written as {outputType.Name()}) takes more than 2 GiB",
                "cut the frames into smaller ones");
        }

        Lattice lattice = layout.Lattice;
        List<PreparedPart> parts = [];
        for (int y = 0; y < Math.Min(lattice.PeriodY, layout.Height); y++)
        {
            for (int x = 0; x < Math.Min(lattice.PeriodX, layout.Width); x++)
                parts.Add(new PreparedPart(x, y, PrepareAll(lattice.IsSingle ? layout : Sublattice(layout, x, y))));
        }

        return new PreparedFrame(layout, outputType, parts);
    }

    /// <summary>Layout of the sub-lattice at an offset.</summary>
    public static FrameLayout Sublattice(FrameLayout layout, int offsetX, int offsetY) => layout with
    {
        Width = Mosaic.Share(layout.Width, layout.Lattice.PeriodX, offsetX),
        Height = Mosaic.Share(layout.Height, layout.Lattice.PeriodY, offsetY),
        Lattice = Lattice.Single,
        Pitch = Math.Max(layout.Lattice.PeriodX, layout.Lattice.PeriodY),
    };

    private List<PreparedStep> PrepareAll(FrameLayout layout)
    {
        List<PreparedStep> steps = [];
        WorkType type = layout.WorkType;
        for (int i = 0; i < plan.Steps.Count; i++)
        {
            PlannedStep planned = plan.Steps[i];
            if (!planned.AppliesTo(layout))
                continue;
            type = TypeFor(planned, type);
            steps.Add(new PreparedStep(i + 1, planned, type, Prepare(planned, layout, type)));
        }

        return steps;
    }

    private static IFilterStep Prepare(PlannedStep planned, FrameLayout layout, WorkType type)
    {
        try
        {
            return planned.Filter.Plugin.Prepare(layout, type, planned.Values);
        }
        catch (ParameterException fault)
        {
            RecipePlace place = planned.Section.Places.TryGetValue(fault.Parameter, out RecipePlace key) ? key : planned.Section.Place;
            throw new RecipeException(
                place.ToString(), $"{planned.Section.Filter}: {fault.Parameter} {fault.What}", fault.Remedy, fault);
        }
    }

    /// <summary>The type itself where the filter lists it, else the narrowest floating-point type listed that holds it.</summary>
    private static WorkType TypeFor(PlannedStep planned, WorkType type)
    {
        IReadOnlyList<WorkType> listed = planned.Filter.Plugin.WorkTypes;
        if (listed.Contains(type))
            return type;
        if (type < WorkType.Float32 && listed.Contains(WorkType.Float32))
            return WorkType.Float32;
        if (type < WorkType.Float64 && listed.Contains(WorkType.Float64))
            return WorkType.Float64;
        throw new RecipeException(
            planned.Section.Place.ToString(),
            $"{planned.Section.Filter} cannot compute in {type}, the type that holds the samples",
            "use another filter or convert the stack first");
    }
}
