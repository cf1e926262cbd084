using Stacks.Abstractions;
using Stacks.Noise;

namespace Stacks.Pipeline;

/// <summary>What a frame in flight takes, so that a plan can state its need before the run starts.</summary>
public static class FrameMemory
{
    /// <summary>
    /// Bytes of one frame slot: raw, stored and result samples, flags twice, two planes of every work type that the
    /// steps use, the same for a sub-lattice of a mosaic, the scratch of all steps and of measuring, and the encoded
    /// bytes (taken as large as the result).
    /// </summary>
    /// <param name="plan">The plan; its frames in flight do not count.</param>
    /// <param name="frame">Index of the frame.</param>
    /// <exception cref="RecipeException">A filter refuses its parameters for this frame.</exception>
    public static long BytesOf(RunPlan plan, int frame)
    {
        PreparedFrame prepared = new PreparedSteps(plan).For(plan.LayoutOf(frame));
        FrameLayout layout = prepared.Layout;
        long samples = layout.Length;
        long result = samples * prepared.OutputType.Size();
        long bytes = (2 * layout.StoredBytes) + (2 * samples) + result + (prepared.IsRewritten ? result : 0) + (plan.WriteMask ? samples : 0);

        IReadOnlyList<PreparedStep> steps = prepared.Parts[0].Steps;
        WorkType[] types = [.. steps.Select(s => s.Type).Append(layout.WorkType).Distinct()];
        bytes += types.Sum(t => samples * SizeOf(t));
        if (layout.Lattice.IsSingle)
        {
            bytes += steps.Select(s => s.Type).Distinct().Sum(t => samples * SizeOf(t));
        }
        else
        {
            FrameLayout part = PreparedSteps.Sublattice(layout, 0, 0);
            bytes += part.Length * (2 + types.Sum(t => 2 * SizeOf(t)));
        }

        long measuring = DifferenceNoise.ScratchBytes(layout.Width, layout.Height);
        return bytes + measuring + steps.Sum(s => s.Step.ScratchBytes);
    }

    private static long SizeOf(WorkType type) => type switch
    {
        WorkType.UInt16 or WorkType.Int16 => 2,
        WorkType.Float32 => 4,
        _ => 8,
    };
}
