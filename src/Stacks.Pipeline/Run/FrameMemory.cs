using Stacks.Abstractions;
using Stacks.Noise;

namespace Stacks.Pipeline;

/// <summary>What a frame in flight takes, so that a plan can state its need before the run starts.</summary>
internal static class FrameMemory
{
    /// <summary>
    /// Bytes of one frame slot: raw and stored samples, those of the result where they are other ones, flags (twice where
    /// decisions of steps are kept), two planes of every work type that the steps use, the same for a sub-lattice of a
    /// mosaic, the scratch of all steps and of measuring, and the encoded bytes (taken as large as the result).
    /// </summary>
    public static long BytesOf(FrameKind kind, bool mask)
    {
        FrameLayout layout = kind.Layout;
        long samples = layout.Length;
        long result = samples * kind.Output.Size();
        bool isSelective = kind.Steps.Any(s => s.Step.Filter.Plugin.Kind == FilterKind.Selective);
        bool isRewritten = kind.Output != layout.SampleType || kind.Steps.Any(s => s.Step.Filter.Plugin.Kind == FilterKind.Smoothing);
        int flagPlanes = isSelective ? 2 : 1;
        long bytes = kind.SourceBytes + (samples * flagPlanes) + (result * (isRewritten ? 2 : 1)) + (mask ? samples : 0);

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
            bytes += part.Length * (flagPlanes + types.Sum(t => 2 * SizeOf(t)));
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
