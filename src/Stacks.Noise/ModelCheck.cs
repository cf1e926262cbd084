using System.Globalization;

namespace Stacks.Noise;

/// <summary>
/// Compares a noise model with the frames it is used for, by the ratio of measured to modelled noise at the local level
/// (<see cref="NoiseMeasurement.Ratio"/>), so that a difference of level within the frame does not mislead.
/// </summary>
public static class ModelCheck
{
    /// <summary>A ratio beyond this factor, either way, is a disagreement.</summary>
    public const double Factor = 1.5;

    /// <summary>True when a ratio says that model and frame disagree; false for NaN.</summary>
    public static bool Disagrees(double ratio) => ratio is > Factor or < 1 / Factor;

    /// <summary>What a disagreement likely comes from, and what to do.</summary>
    public static string Explain(double ratio) => ratio < 1
        ? "the model expects more noise than there is: is the bias level taken for signal (pedestal too low or left out), the gain too low, or the stack averaged or smoothed already?"
        : "there is more noise than the model expects: is the gain too high (a camera setting instead of e-/ADU), the read noise too low, or the pedestal above the true one?";

    /// <summary>The warning for a stack.</summary>
    /// <param name="frame">First frame that disagrees, from 0.</param>
    /// <param name="ratio">Its ratio.</param>
    /// <param name="frames">Frames that disagree.</param>
    /// <param name="frameCount">Frames in all.</param>
    public static string Warning(int frame, double ratio, int frames, int frameCount) => string.Create(
        CultureInfo.InvariantCulture,
        $"frame {frame}: measured noise is {ratio:0.00} times the model's (so in {frames} of {frameCount} frames); {Explain(ratio)}");
}
