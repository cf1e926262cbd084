using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;

namespace Stacks.Tests.Tiff;

/// <summary>Shorthand for tests that open a few bytes.</summary>
internal static class TinyFiles
{
    public static readonly (SampleType Type, int Bits, int Format)[] Types =
    [
        (SampleType.UInt8, 8, 1), (SampleType.Int8, 8, 2), (SampleType.UInt16, 16, 1), (SampleType.Int16, 16, 2),
        (SampleType.UInt32, 32, 1), (SampleType.Int32, 32, 2), (SampleType.UInt64, 64, 1), (SampleType.Int64, 64, 2),
        (SampleType.Float16, 16, 3), (SampleType.Float32, 32, 3), (SampleType.Float64, 64, 3),
    ];

    public static TinyPage Page(int width = 7, int height = 5, int bits = 16, int format = 1, int seed = 1, int perPixel = 1) => new()
    {
        Width = width,
        Height = height,
        Bits = bits,
        Format = format,
        PerPixel = perPixel,
        Samples = TinyTiff.SomeSamples(width * height * perPixel, bits, format, seed),
    };

    public static string Write(TemporaryFolder folder, byte[] bytes, string name = "in.tif")
    {
        string path = folder.File(name);
        File.WriteAllBytes(path, bytes);
        return path;
    }

    public static IStackReader Open(TemporaryFolder folder, byte[] bytes, bool allowTruncated = false, string name = "in.tif") =>
        new TiffFormat().Open(Write(folder, bytes, name), new ReadOptions { AllowTruncated = allowTruncated });

    public static StackFormatException Refusal(byte[] bytes)
    {
        using TemporaryFolder folder = new();
        return Xunit.Assert.Throws<StackFormatException>(() => Open(folder, bytes).Dispose());
    }
}
