using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.TestSupport;

namespace Stacks.Benchmarks;

/// <summary>Frames of 2048 x 2048 unsigned 16-bit samples, a level of 1000 ADU with noise of 10 ADU and a gradient, seeded; and a folder for files.</summary>
internal sealed class Scene : IDisposable
{
    /// <summary>Width and height, pixels.</summary>
    public const int Side = 2048;

    private readonly TemporaryFolder folder = new();
    private readonly ushort[][] frames = [.. Enumerable.Range(0, 4).Select(Frame)];

    /// <summary>Stored samples of a frame; only four differ.</summary>
    public byte[] Stored(int frame) => MemoryMarshal.AsBytes(frames[frame % frames.Length].AsSpan()).ToArray();

    /// <summary>The layout of every frame.</summary>
    public static FrameLayout Layout { get; } = new() { Width = Side, Height = Side, SampleType = SampleType.UInt16, QuantisationStep = 1 };

    /// <summary>A stack in memory.</summary>
    public IStackReader Stack(int count) => new ForeignStack([.. Enumerable.Range(0, count).Select(i => (Layout, Stored(i)))]);

    /// <summary>Path of a file that is removed at the end.</summary>
    public string File(string name) => folder.File(name);

    /// <inheritdoc/>
    public void Dispose() => folder.Dispose();

    private static ushort[] Frame(int seed)
    {
        Random random = new(seed);
        ushort[] samples = new ushort[Side * Side];
        for (int i = 0; i < samples.Length; i++)
        {
            // Twelve uniform numbers have a variance of 1 and are near enough to Gaussian for a coder's statistics.
            double sum = -6;
            for (int k = 0; k < 12; k++)
                sum += random.NextDouble();
            samples[i] = (ushort)(1000 + ((i % Side) / 16) + (10 * sum));
        }

        return samples;
    }
}
