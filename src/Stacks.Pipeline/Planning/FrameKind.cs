using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>A step as it takes effect on one kind of frame.</summary>
/// <param name="Step">The step.</param>
/// <param name="WorkType">Type it computes in.</param>
/// <param name="Resolved">Its parameters in samples of the frame, or of a sub-lattice of it.</param>
/// <param name="Reach">Largest distance of influence in samples; null for the whole frame.</param>
/// <param name="ScratchBytes">Most scratch of one call.</param>
public sealed record KindStep(PlannedStep Step, WorkType WorkType, IReadOnlyList<ResolvedParameter> Resolved, int? Reach, long ScratchBytes);

/// <summary>Frames that are alike in all that matters to a filter.</summary>
/// <param name="Layout">Their layout, without z and time; with its extension only where noise comes from headers.</param>
/// <param name="FirstFrame">Index of the first of them.</param>
/// <param name="Count">How many there are.</param>
/// <param name="Steps">The steps that apply to them.</param>
/// <param name="Output">Sample type of their results.</param>
/// <param name="SourceBytes">Bytes that one of them takes as it is read and decoded.</param>
/// <param name="Noise">Origin and formula of the noise model of the first of them; null when there is none.</param>
public sealed record FrameKind(FrameLayout Layout, int FirstFrame, int Count, IReadOnlyList<KindStep> Steps, SampleType Output, long SourceBytes, string? Noise);

/// <summary>Sorts a stack's frames into kinds and prepares every step on each, so that errors come before the run.</summary>
internal static class FrameKinds
{
    /// <summary>The kinds in order of their first frames.</summary>
    /// <exception cref="RecipeException">A step does not fit a kind, or no frame has the channel that a table names.</exception>
    public static IReadOnlyList<FrameKind> Of(RunPlan plan)
    {
        Dictionary<FrameLayout, (int First, int Count)> layouts = [];
        for (int frame = 0; frame < plan.Reader.FrameCount; frame++)
        {
            FrameLayout layout = plan.LayoutOf(frame) with { Z = null, Time = null };
            if (plan.NoiseSectionOf(layout)?.From != NoiseOrigin.Header)
                layout = layout with { Extension = null };
            layouts[layout] = layouts.TryGetValue(layout, out (int First, int Count) seen) ? (seen.First, seen.Count + 1) : (frame, 1);
        }

        CheckChannels(plan.Recipe, plan.Steps, layouts.Keys);
        PreparedSteps prepared = new(plan);
        NoiseModels models = new(plan);
        return [.. layouts.OrderBy(k => k.Value.First).Select(k => Kind(k.Key, prepared.For(k.Key), models, SourceBytes(plan.Reader, k.Value.First), k.Value.First, k.Value.Count))];
    }

    private static FrameKind Kind(FrameLayout layout, PreparedFrame frame, NoiseModels models, long sourceBytes, int first, int count)
    {
        FrameNoise? noise = models.For(first, layout);
        foreach (PreparedStep step in frame.Parts[0].Steps.Where(s => s.NeedsNoise && noise is null))
        {
            throw new RecipeException(step.Planned.Section.Place.ToString(),
                $"filter {step.Planned.Section.Filter} has no noise model for channel {ChannelSelector.NameOf(layout)}",
                "add a noise table for that channel, or one without channel = ... for all others");
        }

        string? text = noise?.Model is { } model ? $"{noise.Origin}: {model.Describe()}" : noise?.Origin;
        return new FrameKind(layout, first, count, [.. frame.Parts[0].Steps.Select((s, i) => Step(s, frame, i))], frame.OutputType, sourceBytes, text);
    }

    private static long SourceBytes(IStackReader reader, int frame) =>
        reader.RawBytes(frame) + (reader.DecodesInPlace(frame) ? 0 : reader.Layout(frame).StoredBytes);

    private static KindStep Step(PreparedStep step, PreparedFrame frame, int index) => new(
        step.Planned, step.Type, step.Step.Resolved, step.Step.Reach, frame.Parts.Max(p => p.Steps[index].Step.ScratchBytes));

    private static void CheckChannels(Recipe recipe, IReadOnlyList<PlannedStep> steps, IReadOnlyCollection<FrameLayout> layouts)
    {
        IEnumerable<(string? Channel, RecipePlace Place)> named =
            steps.Select(s => (s.Section.Channel, s.Section.ChannelPlace)).Concat(recipe.Noise.Select(n => (n.Channel, n.Place)));
        foreach ((string? channel, RecipePlace place) in named)
        {
            if (!layouts.Any(l => ChannelSelector.Matches(channel, l)))
            {
                throw new RecipeException(place.ToString(), $"no frame of the stack has channel {channel}",
                    "its channels are " + string.Join(", ", layouts.Select(ChannelSelector.NameOf).Distinct()));
            }
        }
    }
}
