namespace Stacks.Abstractions;

/// <summary>How the samples of a result are compressed. Every way is lossless.</summary>
public enum OutputCompression
{
    /// <summary>Not compressed.</summary>
    None,

    /// <summary>By the format's own usual method.</summary>
    Lossless,

    /// <summary>Deflate (RFC 1950), after a predictor where the format has one.</summary>
    Deflate,

    /// <summary>Zstandard (RFC 8878), after a predictor where the format has one.</summary>
    Zstd,
}
