using System.Text;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;

namespace Stacks.Tests.Tiff;

/// <summary>Values of a page's fields.</summary>
internal static class Fields
{
    public static byte[]? Bytes(TiffReader reader, int page, int tag)
    {
        TiffDirectory directory = TiffDirectory.Read(reader.File, new FileWindow(reader.File), reader.Index.Pages[page].Directory, "");
        if (directory.Find((ushort)tag) is not { } found)
            return null;
        byte[] bytes = new byte[found.ByteLength];
        reader.File.Read(found.ValueAt, bytes);
        return bytes;
    }

    public static string? Text(TiffReader reader, int page, int tag) =>
        Bytes(reader, page, tag) is { } bytes ? Encoding.UTF8.GetString(bytes).TrimEnd('\0') : null;
}

/// <summary>A source of another format: layouts and zeros.</summary>
internal sealed class LayoutsOnly(FrameLayout layout, int frames) : IStackReader
{
    public string Path => "other";

    public IStackFormat Format => throw new NotSupportedException();

    public int FrameCount => frames;

    public IReadOnlyList<StackPart> Parts => [];

    public IReadOnlyList<HeaderFact> Facts => [];

    public FrameLayout Layout(int frame) => layout;

    public HeaderNoise NoiseOf(int frame) => new(null, null, null, "", null);

    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation) => [];

    public void Read(int frame, ByteBuffer raw) => raw.Resize((int)layout.StoredBytes).Clear();

    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored) => raw.CopyTo(stored);

    public bool MarkQuality(int frame, Plane<SampleFlags> flags) => false;

    public void Dispose()
    {
    }
}
