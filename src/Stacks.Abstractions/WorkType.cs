namespace Stacks.Abstractions;

/// <summary>
/// The four types in which filters compute. Integers of 8 and 16 bits whose stored samples are their values stay
/// integers; everything else is floating point. See <see cref="FrameLayout.WorkType"/> for the rule.
/// </summary>
public enum WorkType
{
    /// <summary><see cref="ushort"/>: unsigned integers of 8 and 16 bits.</summary>
    UInt16,

    /// <summary><see cref="short"/>: signed integers of 8 and 16 bits.</summary>
    Int16,

    /// <summary><see cref="float"/>: floats of 16 and 32 bits.</summary>
    Float32,

    /// <summary><see cref="double"/>: wider integers, doubles, and every sample with a scaling of its own.</summary>
    Float64,
}
