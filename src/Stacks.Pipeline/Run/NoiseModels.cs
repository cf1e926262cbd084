using System.Collections.Concurrent;
using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>The noise model of one frame and where it comes from.</summary>
/// <param name="Model">The model; null where it must be measured on the frame.</param>
/// <param name="Origin">Where it comes from.</param>
/// <param name="Doubt">A caution about it; null for none.</param>
internal sealed record FrameNoise(NoiseModel? Model, string Origin, string? Doubt)
{
    /// <summary>True when the model is a constant sigma measured on the frame itself.</summary>
    public bool IsMeasured { get; init; }
}

/// <summary>Finds each frame's noise model as the recipe asks. Safe for concurrent use.</summary>
internal sealed class NoiseModels(RunPlan plan)
{
    private readonly ConcurrentDictionary<(NoiseSection Section, double Step), FrameNoise> fromValues = new();

    /// <summary>The model of a frame; null when the recipe has none for its channel.</summary>
    /// <exception cref="RecipeException">The recipe, with the headers where it asks for them, leaves a value open.</exception>
    public FrameNoise? For(int frame, FrameLayout layout)
    {
        NoiseSection? section = plan.NoiseSectionOf(layout);
        return section?.From switch
        {
            null => null,
            NoiseOrigin.Frame => new FrameNoise(null, "measured on each frame", null) { IsMeasured = true },
            NoiseOrigin.Values => fromValues.GetOrAdd((section, layout.QuantisationStep), FromValues),
            NoiseOrigin.Header => FromHeader(section, frame, layout),
            _ => throw new RecipeException(
                section.Place.ToString(), "from = \"file\" cannot be read by this version", "state gain, read_noise and pedestal with from = \"values\""),
        };
    }

    /// <summary>The model of a constant sigma; null when the frame has no measurable noise.</summary>
    public static NoiseModel? Measured(double sigma) => sigma > 0 && sigma * sigma > 0 ? LinearNoise.Constant(sigma) : null;

    private static FrameNoise FromValues((NoiseSection Section, double Step) key)
    {
        NoiseSection section = key.Section;
        if (section.Sigma is { } sigma)
            return new FrameNoise(LinearNoise.Constant(sigma), "recipe", null);
        return new FrameNoise(Camera(section, section.Gain, section.ReadNoise, section.Pedestal, key.Step, "the recipe"), "recipe", null);
    }

    private FrameNoise FromHeader(NoiseSection section, int frame, FrameLayout layout)
    {
        HeaderNoise header = plan.Reader.NoiseOf(frame);
        NoiseModel model = Camera(
            section,
            section.Gain ?? header.Gain,
            section.ReadNoise ?? header.ReadNoise,
            section.Pedestal ?? header.Pedestal,
            layout.QuantisationStep,
            string.Create(CultureInfo.InvariantCulture, $"the header of frame {frame} of {Path.GetFileName(plan.Reader.Path)}"));
        bool allStated = section is { Gain: not null, ReadNoise: not null, Pedestal: not null };
        return new FrameNoise(model, allStated ? "recipe" : $"header ({header.Origin})", allStated ? null : header.Doubt);
    }

    private static LinearNoise Camera(
        NoiseSection section, double? gain, double? readNoise, double? pedestal, double quantisationStep, string source)
    {
        string place = section.Place.ToString();
        if (gain is not > 0 || !double.IsFinite(gain.Value))
            throw new RecipeException(place, $"{source} states no usable gain", "add gain (e-/ADU) to [noise], or measure with from = \"frame\"");
        if (readNoise is not >= 0 || !double.IsFinite(readNoise.Value))
            throw new RecipeException(place, $"{source} states no usable read noise", "add read_noise (e-) to [noise], or measure with from = \"frame\"");
        if (pedestal is null || !double.IsFinite(pedestal.Value))
        {
            throw new RecipeException(
                place,
                $"{source} states no pedestal (level without light), and a missing one is not zero",
                "add pedestal (ADU; 0 where the bias has been subtracted) to [noise], or measure with from = \"frame\"");
        }

        if (readNoise == 0 && quantisationStep == 0)
            throw new RecipeException(place, $"{source} states a read noise of 0, so samples at the pedestal would have no noise", "add read_noise (e-, above 0) to [noise]");
        return LinearNoise.FromCamera(gain.Value, readNoise.Value, pedestal.Value, quantisationStep);
    }
}
