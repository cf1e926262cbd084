using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Pipeline;

/// <summary>The noise model of one frame and where it comes from.</summary>
/// <param name="Model">The model.</param>
/// <param name="Origin">Where it comes from.</param>
internal sealed record FrameNoise(NoiseModel Model, string Origin);

/// <summary>Finds each frame's noise model as the recipe asks.</summary>
internal sealed class NoiseModels(RunPlan plan)
{
    /// <summary>The model of a frame; null when the recipe has none for its channel.</summary>
    public FrameNoise? For(int frame, FrameLayout layout, FramePlanes values, Scratch scratch)
    {
        _ = (frame, values, scratch);
        NoiseSection? section = plan.Recipe.Noise.FirstOrDefault(s => ChannelSelector.Matches(s.Channel, layout));
        if (section is null)
            return null;
        NoiseModel model = section.Sigma is { } sigma
            ? LinearNoise.Constant(sigma)
            : LinearNoise.FromCamera(section.Gain ?? 1, section.ReadNoise ?? 0, section.Pedestal ?? 0, layout.QuantisationStep);
        return new FrameNoise(model, "values of the recipe");
    }
}
