namespace Stacks.Formats.Fits;

/// <summary>Sizes that the FITS Standard 4.0 (section 3.1) fixes.</summary>
internal static class FitsBlock
{
    /// <summary>Bytes of a block; headers and data units fill whole blocks.</summary>
    public const int Bytes = 2880;

    /// <summary>Characters of a card.</summary>
    public const int CardBytes = 80;

    /// <summary>Cards in a block.</summary>
    public const int Cards = Bytes / CardBytes;

    /// <summary>The least multiple of a block that holds <paramref name="bytes"/>.</summary>
    /// <exception cref="OverflowException">The result does not fit 64 bits.</exception>
    public static long Padded(long bytes) => checked((bytes + Bytes - 1) / Bytes * Bytes);
}
