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
    public bool Recognises(ReadOnlySpan<byte> start) => HasSignature(start) || IsOmeXml(start);

    /// <inheritdoc/>
    public string? CannotStore(SampleType type) => null;

    /// <inheritdoc/>
    public IStackReader Open(string path, ReadOptions options) => IsCompanion(path)
        ? new OmeSetReader(this, OmeSet.OfCompanion(this, path, path, null, options), options)
        : TiffReader.Open(this, path, options);

    /// <inheritdoc/>
    public IStackWriter Create(WriteRequest request) => new TiffWriter(request);

    /// <summary>True for text that begins as OME-XML does: the companion of a set, which holds its metadata and no planes.</summary>
    private static bool IsOmeXml(ReadOnlySpan<byte> start)
    {
        string text = XmlText.Decode(start[..Math.Min(start.Length, 512)]).TrimStart();
        return text.StartsWith('<') && (text.StartsWith("<OME", StringComparison.Ordinal) || text.Contains(":OME", StringComparison.Ordinal) || text.Contains("<OME", StringComparison.Ordinal));
    }

    private static bool IsCompanion(string path)
    {
        try
        {
            using FileStream file = new(path, FileMode.Open, FileAccess.Read, FileShare.ReadWrite | FileShare.Delete, 0);
            byte[] start = new byte[512];
            return IsOmeXml(start.AsSpan(0, file.ReadAtLeast(start, start.Length, throwOnEndOfStream: false)));
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            return false; // opening it as TIFF says what is wrong
        }
    }

    /// <summary>True for II or MM and then 42 or 43 in that byte order.</summary>
    internal static bool HasSignature(ReadOnlySpan<byte> start) =>
        start.StartsWith("II*\0"u8) || start.StartsWith("MM\0*"u8) || start.StartsWith("II+\0"u8) || start.StartsWith("MM\0+"u8);
}
