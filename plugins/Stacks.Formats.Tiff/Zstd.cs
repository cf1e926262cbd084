using System.Buffers;
using System.Collections.Concurrent;
using System.Globalization;
using Stacks.Abstractions;
using ZstdSharp;

namespace Stacks.Formats.Tiff;

/// <summary>
/// Zstandard frames (RFC 8878), as compression scheme 50000 uses them: a frame a segment. Coding is that of ZstdSharp.Port.
/// A frame is decoded at once into memory of the segment's size, so that nothing it claims can make it larger. Coders are
/// kept and used again.
/// </summary>
internal static class Zstd
{
    /// <summary>The library's default. Measured on differences of 16-bit and float noise: levels below lose up to a tenth in size, those above gain a few hundredths.</summary>
    private const int Level = 3;

    private static readonly ConcurrentBag<Decompressor> Decompressors = [];
    private static readonly ConcurrentBag<Compressor> Compressors = [];

    /// <summary>Decodes to the end of the data.</summary>
    /// <param name="source">Compressed bytes.</param>
    /// <param name="output">Receives the bytes.</param>
    /// <param name="longest">Bytes the data may hold: some writers fill the last strip with rows below the page.</param>
    /// <returns>Null, or what is wrong with the data.</returns>
    public static string? Decode(ReadOnlySpan<byte> source, Span<byte> output, int longest)
    {
        if (!Decompressors.TryTake(out Decompressor? decompressor))
            decompressor = new Decompressor();
        try
        {
            if (decompressor.TryUnwrap(source, output, out int done))
                return done == output.Length ? null : string.Create(CultureInfo.InvariantCulture, $"the Zstandard data end after {done} of {output.Length} bytes");
            if (longest == output.Length)
                return "the Zstandard data are damaged, or longer than the page";

            byte[] rented = ArrayPool<byte>.Shared.Rent(longest);
            bool whole = decompressor.TryUnwrap(source, rented.AsSpan(0, longest), out done) && done >= output.Length;
            rented.AsSpan(0, output.Length).CopyTo(output);
            ArrayPool<byte>.Shared.Return(rented);
            return whole ? null : "the Zstandard data are damaged, or longer than the page";
        }
        catch (ZstdException)
        {
            return "the Zstandard data are damaged";
        }
        finally
        {
            Decompressors.Add(decompressor);
        }
    }

    /// <summary>Appends the compressed form of some bytes.</summary>
    public static void Encode(ReadOnlySpan<byte> source, ByteBuffer output)
    {
        if (!Compressors.TryTake(out Compressor? compressor))
            compressor = new Compressor(Level);
        byte[] rented = ArrayPool<byte>.Shared.Rent(Compressor.GetCompressBound(source.Length));
        output.Append(rented.AsSpan(0, compressor.Wrap(source, rented)));
        ArrayPool<byte>.Shared.Return(rented);
        Compressors.Add(compressor);
    }
}
