namespace Stacks.Abstractions;

/// <summary>
/// What is known of one pixel. The pipeline sets the first three before a filter sees the frame, selective filters set
/// the others. The change mask that is written beside a result holds these same bits, one byte a pixel.
/// </summary>
[Flags]
#pragma warning disable CA1028 // One byte a pixel is the stored form.
public enum SampleFlags : byte
#pragma warning restore CA1028
{
    /// <summary>An ordinary sample.</summary>
    None = 0,

    /// <summary>NaN, infinite, BLANK or masked: takes no part in any window and stays as stored.</summary>
    Missing = 1,

    /// <summary>
    /// At or beyond saturation: stays as stored. It takes part in ranks (it is at least this bright) but not in
    /// averages and not in replacement values.
    /// </summary>
    Saturated = 2,

    /// <summary>In the given defect list: replaced in every frame, whatever its value.</summary>
    Defect = 4,

    /// <summary>Replaced; it stood above its surroundings.</summary>
    ReplacedBright = 8,

    /// <summary>Replaced; it stood below its surroundings.</summary>
    ReplacedDark = 16,

    /// <summary>A bright candidate that the optical bound kept as a source.</summary>
    KeptAsSource = 32,

    /// <summary>Either of the two replaced flags.</summary>
    Replaced = ReplacedBright | ReplacedDark,
}
