using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>What the samples of one frame are like. Values are in value units and NaN when no sample is valid.</summary>
/// <param name="Frame">Index of the frame, from 0.</param>
/// <param name="Layout">Its layout.</param>
/// <param name="Minimum">Smallest valid value.</param>
/// <param name="Median">Median of the valid values.</param>
/// <param name="Maximum">Largest valid value.</param>
/// <param name="Noise">Noise sigma measured on the frame; NaN when not measurable.</param>
/// <param name="Missing">Missing samples.</param>
/// <param name="Saturated">Saturated samples.</param>
public sealed record FrameFigures(
    int Frame, FrameLayout Layout, double Minimum, double Median, double Maximum, double Noise, long Missing, long Saturated);

/// <summary>What a stack is and whether it is whole.</summary>
public sealed record StackInspection
{
    /// <summary>Path as given.</summary>
    public required string Path { get; init; }

    /// <summary>Format id.</summary>
    public required string Format { get; init; }

    /// <summary>Bytes of all files of the stack.</summary>
    public required long FileBytes { get; init; }

    /// <summary>Science frames.</summary>
    public required int FrameCount { get; init; }

    /// <summary>Layouts that differ in more than place in the stack, with the number of their frames, in order.</summary>
    public required IReadOnlyList<(FrameLayout Layout, int Count)> Layouts { get; init; }

    /// <summary>The parts of the file.</summary>
    public required IReadOnlyList<StackPart> Parts { get; init; }

    /// <summary>Facts from the headers.</summary>
    public required IReadOnlyList<HeaderFact> Facts { get; init; }

    /// <summary>What the headers say about the noise of the first frame; null when there is no frame.</summary>
    public required HeaderNoise? Noise { get; init; }

    /// <summary>The frames that were decoded: all, or some at even distances.</summary>
    public required IReadOnlyList<FrameFigures> Figures { get; init; }

    /// <summary>Findings about integrity.</summary>
    public required IReadOnlyList<HealthFinding> Health { get; init; }

    /// <summary>True when a finding is a problem.</summary>
    public bool IsBroken => Health.Any(h => h.IsProblem);
}
