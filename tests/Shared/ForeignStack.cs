using Stacks.Abstractions;

namespace Stacks.TestSupport;

/// <summary>A stack in memory, as if from a file of a format that nobody knows.</summary>
public sealed class ForeignStack(params (FrameLayout Layout, byte[] Stored)[] frames) : IStackReader
{
    public string Path => "foreign.raw";

    public IStackFormat Format => throw new NotSupportedException();

    public int FrameCount => frames.Length;

    public IReadOnlyList<StackPart> Parts => [];

    public IReadOnlyList<HeaderFact> Facts => [];

    public FrameLayout Layout(int frame) => frames[frame].Layout;

    public HeaderNoise NoiseOf(int frame) => new(null, null, null, "", null);

    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation) => [];

    public void Read(int frame, ByteBuffer raw) => frames[frame].Stored.CopyTo(raw.Resize(frames[frame].Stored.Length));

    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored) => raw.CopyTo(stored);

    public bool MarkQuality(int frame, Plane<SampleFlags> flags) => false;

    public void Dispose()
    {
    }

    /// <summary>A frame of random bits with the ends of the type, NaN, infinities and denormals among them.</summary>
    public static (FrameLayout Layout, byte[] Stored) Frame(SampleType type, int width, int height, int seed)
    {
        byte[] stored = new byte[width * height * type.Size()];
        new Random(seed).NextBytes(stored);
        byte[] extremes = type switch
        {
            SampleType.Float32 => Bytes([float.NaN, float.NegativeInfinity, float.PositiveInfinity, -0.0f, float.Epsilon, float.MaxValue, 0], BitConverter.GetBytes),
            SampleType.Float64 => Bytes([double.NaN, double.NegativeInfinity, double.PositiveInfinity, -0.0, double.Epsilon, double.MaxValue, 0], BitConverter.GetBytes),
            _ => [.. Enumerable.Repeat((byte)0, 8), .. Enumerable.Repeat((byte)0xFF, 8), .. Enumerable.Repeat((byte)0x80, 8), 0x7F, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0x7F, 0, 0, 0, 0, 0, 0, 0, 0x80],
        };
        extremes.AsSpan(0, Math.Min(extremes.Length, stored.Length)).CopyTo(stored);
        return (new FrameLayout { Width = width, Height = height, SampleType = type, QuantisationStep = type.IsInteger() ? 1 : 0 }, stored);
    }

    private static byte[] Bytes<T>(T[] values, Func<T, byte[]> bytes) => values.SelectMany(bytes).ToArray();
}
