using Stacks.Abstractions;
using Stacks.Noise;

namespace Stacks.Pipeline;

/// <summary>What a frame in flight takes, so that a plan can state its need before the run starts.</summary>
internal static class FrameMemory
{
    /// <summary>
    /// Bytes of one frame slot: raw, stored and result samples, flags twice, two planes of every work type that the
    /// steps use, the same for a sub-lattice of a mosaic, the scratch of all steps and of measuring, and the encoded
    /// bytes (taken as large as the result).
    /// </summary>
    public static long BytesOf(FrameKind kind, bool mask)
    {
        FrameLayout layout = kind.Layout;
        long samples = layout.Length;
        long result = samples * kind.Output.Size();
        long bytes = (2 * layout.StoredBytes) + (2 * samples) + (2 * result) + (mask ? samples : 0);

        WorkType[] stepTypes = [.. kind.Steps.Select(s => s.WorkType).Distinct()];
        WorkType[] types = [.. stepTypes.Append(layout.WorkType).Distinct()];
        bytes += types.Sum(t => samples * SizeOf(t));
        if (layout.Lattice.IsSingle)
        {
            bytes += stepTypes.Sum(t => samples * SizeOf(t));
        }
        else
        {
            FrameLayout part = PreparedSteps.Sublattice(layout, 0, 0);
            bytes += part.Length * (2 + types.Sum(t => 2 * SizeOf(t)));
        }

        return bytes + DifferenceNoise.ScratchBytes(layout.Width, layout.Height) + kind.Steps.Sum(s => s.ScratchBytes);
    }

    private static long SizeOf(WorkType type) => type switch
    {
        WorkType.UInt16 or WorkType.Int16 => 2,
        WorkType.Float32 => 4,
        _ => 8,
    };
}
