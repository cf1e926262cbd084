using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// The recipe's mask and defect images: one image each, of the frames' shape, non-zero samples marked. The same flags
/// for every frame.
/// </summary>
internal sealed class FrameMasks
{
    private readonly List<MaskImage> images = [];

    /// <summary>Reads the images that the plan's recipe names.</summary>
    /// <exception cref="StackFormatException">A file is broken or holds more than one image.</exception>
    public FrameMasks(RunPlan plan, CancellationToken cancellation)
    {
        Add(plan, plan.Recipe.Input.Mask, SampleFlags.Missing, cancellation);
        Add(plan, plan.Recipe.Input.Defects, SampleFlags.Defect, cancellation);
    }

    /// <summary>The image files read, with their digests.</summary>
    public IReadOnlyList<NamedDigest> Files => [.. images.Select(i => i.File)];

    /// <summary>Checks that the images fit a frame.</summary>
    /// <exception cref="StackFormatException">The frame has another shape than an image.</exception>
    public void CheckShape(int frame, FrameLayout layout)
    {
        foreach (MaskImage image in images)
        {
            if (layout.Width != image.Width || layout.Height != image.Height)
            {
                throw new StackFormatException(
                    image.File.Name,
                    string.Create(CultureInfo.InvariantCulture, $"is {image.Width} x {image.Height} samples, but frame {frame} is {layout.Width} x {layout.Height}"),
                    "give an image of the frames' shape");
            }
        }
    }

    /// <summary>Adds Missing and Defect to a frame's flags.</summary>
    /// <exception cref="StackFormatException">The frame has another shape than an image.</exception>
    public void Mark(int frame, FrameLayout layout, Span<SampleFlags> flags)
    {
        CheckShape(frame, layout);
        foreach (MaskImage image in images)
        {
            for (int i = 0; i < flags.Length; i++)
                flags[i] |= image.Flags[i];
        }
    }

    private void Add(RunPlan plan, string? path, SampleFlags flag, CancellationToken cancellation)
    {
        if (path is null)
            return;
        if (plan.OpenStack is null)
            throw new InvalidOperationException("the recipe names a mask, but the plan cannot open stacks");
        using IStackReader reader = plan.OpenStack(path);
        if (reader.FrameCount != 1)
        {
            throw new StackFormatException(
                path, string.Create(CultureInfo.InvariantCulture, $"holds {reader.FrameCount} images where one is needed"), "give a file with one image");
        }

        FrameLayout layout = reader.Layout(0);
        ByteBuffer raw = new();
        reader.Read(0, raw);
        byte[] stored = new byte[checked((int)layout.StoredBytes)];
        reader.Decode(0, raw.Written, stored);
        double[] values = new double[layout.Length];
        StoredSamples.Of(layout.SampleType).Load<double>(stored, layout.Transform, values);
        SampleFlags[] flags = Array.ConvertAll(values, v => v != 0 ? flag : SampleFlags.None);
        images.Add(new MaskImage(new NamedDigest(Path.GetFileName(path), Digests.OfFile(path, cancellation)), flags, layout.Width, layout.Height));
    }

    private sealed record MaskImage(NamedDigest File, SampleFlags[] Flags, int Width, int Height);
}
