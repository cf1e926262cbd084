using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>The parameters as they take effect on one kind of frame.</summary>
internal sealed record ImpulseRules
{
    /// <summary>t, noise sigmas.</summary>
    public required double Threshold { get; init; }

    /// <summary>g, noise sigmas.</summary>
    public required double Trust { get; init; }

    /// <summary>K, samples.</summary>
    public required int LargestWindow { get; init; }

    /// <summary>f, samples; 0 where no optical bound applies.</summary>
    public required double PsfFwhm { get; init; }

    /// <summary>Impulses above their surroundings are removed.</summary>
    public required bool Bright { get; init; }

    /// <summary>Impulses below their surroundings are removed.</summary>
    public required bool Dark { get; init; }

    /// <summary>q, value units.</summary>
    public required double QuantisationStep { get; init; }

    /// <summary>For help, plan and provenance.</summary>
    public IReadOnlyList<ResolvedParameter> Resolved =>
    [
        new("threshold", Text(Threshold), "noise sigmas"),
        new("trust", Text(Trust), "noise sigmas"),
        new("largest_window", Text(LargestWindow), "px"),
        new("psf_fwhm", Bright ? Text(PsfFwhm) : "unused", Bright ? "px" : ""),
        new("polarity", Bright && Dark ? "both" : Bright ? "bright" : "dark", ""),
    ];

    private static string Text(double number) => number.ToString("R", CultureInfo.InvariantCulture);
}
