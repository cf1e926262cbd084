using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Formats.Fits.Tiles;
using Stacks.Formats.Tiff;

namespace Stacks.Fuzz;

/// <summary>
/// What is fuzzed, by name. A target takes any bytes and returns; an exception other than <see cref="StacksException"/> out
/// of a reader, or any out of a code, is a fault of ours.
/// </summary>
internal static class Targets
{
    private const long MostSamples = 1 << 20;

    /// <summary>The targets.</summary>
    public static IReadOnlyDictionary<string, Action<byte[]>> All { get; } = new Dictionary<string, Action<byte[]>>
    {
        ["fits-header"] = bytes => Read(new FitsFormat(), bytes),
        ["fits-rice"] = bytes => Tile(bytes, (stream, width, pixels) =>
        {
            RiceCode.Decode(stream, width, pixels);
            RiceCode.Decode(stream, width, MemoryMarshal.Cast<int, short>(pixels));
            RiceCode.Decode(stream, width, MemoryMarshal.AsBytes(pixels));
        }),
        ["fits-gzip"] = bytes => Tile(bytes, (stream, _, pixels) => GzipTile.Decode(stream, MemoryMarshal.AsBytes(pixels))),
        ["fits-plio"] = bytes => Tile(bytes, (stream, _, pixels) => PlioCode.Decode(stream, pixels)),
        ["fits-hcompress"] = bytes => Tile(bytes, (stream, width, pixels) =>
        {
            HcompressCode.Decode(stream, width, smooth: false, pixels);
            HcompressCode.Decode(stream, width, smooth: true, pixels);
        }),
        ["tiff-directory"] = bytes => Read(new TiffFormat(), bytes),
        ["tiff-lzw"] = bytes => Tile(bytes, (stream, _, pixels) => Lzw.Decode(stream, MemoryMarshal.AsBytes(pixels))),
        ["tiff-packbits"] = bytes => Tile(bytes, (stream, _, pixels) => PackBits.Decode(stream, MemoryMarshal.AsBytes(pixels))),
        ["tiff-predictors"] = Predictors,
    };

    private delegate void DecodeTile(ReadOnlySpan<byte> stream, int width, Span<int> pixels);

    /// <summary>The first two bytes are width - 1 and height - 1 of the tile, the others its stream.</summary>
    private static void Tile(byte[] bytes, DecodeTile decode)
    {
        if (bytes.Length >= 2)
            decode(bytes.AsSpan(2), bytes[0] + 1, new int[(bytes[0] + 1) * (bytes[1] + 1)]);
    }

    /// <summary>The first byte chooses the size of a sample and the samples of a pixel, the second the pixels of a row.</summary>
    private static void Predictors(byte[] bytes)
    {
        if (bytes.Length < 2)
            return;
        int size = 1 << (bytes[0] & 3), perPixel = 1 + ((bytes[0] >> 2) & 3), row = size * perPixel * (bytes[1] + 1);
        Span<byte> rows = bytes.AsSpan(2, (bytes.Length - 2) / row * row);
        HorizontalPredictor.Undo(rows, row, size, perPixel);
        if (size > 1)
            FloatingPointPredictor.Undo(rows, row, size, perPixel);
    }

    /// <summary>Opens the bytes as a file, looks it over and decodes its first and last frames.</summary>
    private static void Read(IStackFormat format, byte[] bytes)
    {
        string path = Path.Combine(Path.GetTempPath(), $"stacks-fuzz-{Environment.ProcessId}-{Environment.CurrentManagedThreadId}");
        try
        {
            File.WriteAllBytes(path, bytes);
            using IStackReader reader = format.Open(path, new ReadOptions { AllowTruncated = bytes.Length % 2 == 0 });
            _ = reader.Parts;
            _ = reader.Facts;
            foreach (HealthFinding finding in reader.CheckHealth(CancellationToken.None))
                _ = finding.Text;
            ByteBuffer raw = new();
            foreach (int frame in new[] { 0, reader.FrameCount - 1 })
            {
                FrameLayout layout = reader.Layout(frame);
                _ = reader.NoiseOf(frame);
                if (layout.Length > MostSamples)
                    continue;
                reader.Read(frame, raw);
                reader.Decode(frame, raw.Written, new byte[layout.StoredBytes]);
                reader.MarkQuality(frame, new Plane<SampleFlags>(new SampleFlags[layout.Length], layout.Width, layout.Height));
            }
        }
        catch (StacksException)
        {
            // The way out that a user sees as one line.
        }
        finally
        {
            File.Delete(path);
        }
    }
}
