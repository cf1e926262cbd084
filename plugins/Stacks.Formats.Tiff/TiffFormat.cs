using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// TIFF 6.0 and BigTIFF in both byte orders, plain and OME-TIFF: pages of one or more samples a pixel, chunky or planar,
/// 8 to 64-bit integers and 16 to 64-bit floats, strips or tiles, uncompressed, PackBits, LZW, Deflate or Zstandard,
/// predictors 1 to 3. Written: strips, uncompressed or Deflate or Zstandard with predictor.
/// </summary>
public sealed class TiffFormat : IStackFormat
{
    /// <inheritdoc/>
    public string Id => "tiff";

    /// <inheritdoc/>
    public string Extension => ".tif";

    /// <inheritdoc/>
    public IReadOnlyList<string> Endings { get; } = [".tif", ".tiff"];

    /// <inheritdoc/>
    public bool Recognises(ReadOnlySpan<byte> start) => HasSignature(start);

    /// <inheritdoc/>
    public string? CannotStore(SampleType type) => null;

    /// <inheritdoc/>
    public IStackReader Open(string path, ReadOptions options) => TiffReader.Open(this, path, options);

    /// <inheritdoc/>
    public IStackWriter Create(WriteRequest request) => new TiffWriter(request);

    /// <summary>True for II or MM and then 42 or 43 in that byte order.</summary>
    internal static bool HasSignature(ReadOnlySpan<byte> start) =>
        start.StartsWith("II*\0"u8) || start.StartsWith("MM\0*"u8) || start.StartsWith("II+\0"u8) || start.StartsWith("MM\0+"u8);
}
