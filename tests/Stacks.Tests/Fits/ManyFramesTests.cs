using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Files of 2,000 extensions and cubes of 100,000 frames: costs grow with the number of parts, not with its square.</summary>
public sealed class ManyFramesTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    [Fact]
    public void Two_thousand_extensions()
    {
        long few = Cost(500), many = Cost(2000);
        Assert.True(many < 5 * few, $"{few} bytes for 500 extensions, {many} for 2000");

        long Cost(int extensions)
        {
            FitsBytes file = new FitsBytes().Primary(8, [], []);
            for (int i = 0; i < extensions; i++)
                file.Image(16, [8, 4], FitsBytes.Shorts([.. Enumerable.Range(i, 32)]), FitsBytes.Text("EXTNAME", "SCI"), FitsBytes.Card("EXTVER", i + 1));
            string path = file.Save(folder, $"{extensions}.fits");
            long before = GC.GetAllocatedBytesForCurrentThread();
            new FitsFormat().Open(path, new ReadOptions()).Dispose();
            long cost = GC.GetAllocatedBytesForCurrentThread() - before;
            HostRun.Of("", path, folder.File("out.fits"));
            using IStackReader result = new FitsFormat().Open(folder.File("out.fits"), new ReadOptions());
            Assert.Equal(extensions, result.FrameCount);
            Assert.Equal(FitsBytes.Shorts([.. Enumerable.Range(extensions - 1, 32)]), PassThrough.Stored(result, extensions - 1).Chunk(2).SelectMany(s => s.Reverse()));
            return cost;
        }
    }

    /// <summary>The frames of a cube share one layout: an index of 100,000 of them is a few numbers.</summary>
    [Fact]
    public void A_hundred_thousand_frames()
    {
        const int frames = 100_000;
        byte[] data = new byte[frames * 32];
        for (int i = 0; i < frames; i++)
            BitConverter.TryWriteBytes(data.AsSpan(32 * i), i);
        string path = folder.File("in.fits");
        File.WriteAllBytes(path, [.. new FitsBytes().Primary(16, [4, 4, frames], []).ToArray().AsSpan(0, 2880), .. data, .. new byte[(2880 - (data.Length % 2880)) % 2880]]);

        long before = GC.GetAllocatedBytesForCurrentThread();
        using IStackReader reader = new FitsFormat().Open(path, new ReadOptions());
        Assert.Equal(frames, reader.FrameCount);
        Assert.Same(reader.Layout(0), reader.Layout(frames - 1));
        Assert.InRange(GC.GetAllocatedBytesForCurrentThread() - before, 0, 1 << 20);
        Assert.Equal(frames - 1, System.Buffers.Binary.BinaryPrimitives.ReadInt32LittleEndian([.. PassThrough.Stored(reader, frames - 1)[..4].Chunk(2).SelectMany(s => s.Reverse())]));
    }
}
