using System.IO.Compression;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>FITS, as the FITS Standard 4.0 (IAU FITS Working Group, 2018) defines it.</summary>
public sealed class FitsFormat : IStackFormat
{
    private static ReadOnlySpan<byte> FirstKeyword => "SIMPLE  ="u8;

    private static ReadOnlySpan<byte> GzipMagic => [0x1F, 0x8B];

    /// <inheritdoc/>
    public string Id => "fits";

    /// <inheritdoc/>
    public string Extension => ".fits";

    /// <inheritdoc/>
    public IReadOnlyList<string> Endings { get; } = [".fits", ".fit", ".fts"];

    /// <summary>True for a file whose first card is SIMPLE, and for one that would be so if it were not gzipped.</summary>
    public bool Recognises(ReadOnlySpan<byte> start) =>
        start.StartsWith(FirstKeyword) || (start.StartsWith(GzipMagic) && Inflated(start).StartsWith(FirstKeyword));

    /// <inheritdoc/>
    public string? CannotStore(SampleType type) =>
        type == SampleType.Float16 ? "FITS has no 16-bit floating-point numbers (BITPIX is 8, 16, 32, 64, -32 or -64)" : null;

    /// <inheritdoc/>
    public string? CannotCompress(OutputCompression compression) => compression switch
    {
        OutputCompression.None or OutputCompression.Lossless => null,
        _ => $"FITS images are not compressed with {compression} alone; 'lossless' compresses them, by RICE_1 to integers of 32 bits and by GZIP_2 beyond",
    };

    /// <inheritdoc/>
    public IStackReader Open(string path, ReadOptions options) => new FitsReader(this, path, options);

    /// <inheritdoc/>
    public IStackWriter Create(WriteRequest request) => new FitsWriter(request);

    /// <summary>The first bytes behind a gzip header; none when they are not to be had.</summary>
    private static ReadOnlySpan<byte> Inflated(ReadOnlySpan<byte> start)
    {
        byte[] first = new byte[FirstKeyword.Length];
        try
        {
            using GZipStream stream = new(new MemoryStream(start.ToArray()), CompressionMode.Decompress);
            return first.AsSpan(0, stream.ReadAtLeast(first, first.Length, throwOnEndOfStream: false));
        }
        catch (InvalidDataException)
        {
            return [];
        }
    }
}
