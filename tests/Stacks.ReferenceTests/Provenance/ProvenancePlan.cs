using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.ReferenceTests.Provenance;

/// <summary>A plan of which a sidecar needs file names and plugins alone.</summary>
internal static class ProvenancePlan
{
    public static RunPlan Of(string recipePath) => new()
    {
        Reader = null!,
        Recipe = new Recipe { Path = recipePath },
        RecipeDigest = "",
        Steps = [],
        OutputPath = "out.fits",
        OutputFormat = (IStackFormat)null!,
        FormatOrigins = [new PluginOrigin("Memory", "1.0", "memory.dll", "f0")],
        WriteMask = false,
        Workers = 1,
        FramesInFlight = 1,
        Overwrite = false,
    };
}
