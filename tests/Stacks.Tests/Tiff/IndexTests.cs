using System.Diagnostics;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.Tests.Engine;
using Stacks.TestSupport;
using Xunit;
using Xunit.Abstractions;

namespace Stacks.Tests.Tiff;

/// <summary>What a stack of 100,000 pages costs in memory; the time is printed, not tested.</summary>
[Collection(AloneCollection.Name)]
public sealed class IndexTests(ITestOutputHelper output)
{
    [Theory]
    [InlineData(false)]
    [InlineData(true)]
    public void An_index_of_100000_pages_keeps_less_than_64_MB(bool big)
    {
        const int Pages = 100_000;
        using TemporaryFolder folder = new();
        string path = TinyFiles.Write(folder, ManyPages.Build(Pages, big));
        new TiffFormat().Open(TinyFiles.Write(folder, ManyPages.Build(10, big), "warm.tif"), new ReadOptions()).Dispose();

        long before = GC.GetTotalMemory(forceFullCollection: true);
        long allocated = GC.GetAllocatedBytesForCurrentThread();
        long start = Stopwatch.GetTimestamp();
        using IStackReader reader = new TiffFormat().Open(path, new ReadOptions());
        output.WriteLine($"opened in {Stopwatch.GetElapsedTime(start).TotalMilliseconds:F0} ms, {(GC.GetAllocatedBytesForCurrentThread() - allocated) / 1e6:F1} MB passed through");
        long kept = GC.GetTotalMemory(forceFullCollection: true) - before;
        output.WriteLine($"{kept / 1e6:F1} MB kept");
        Assert.InRange(kept, Pages * 32L, 64L << 20);

        Assert.Equal(Pages, reader.FrameCount);
        Assert.Equal(BitConverter.GetBytes(unchecked((ushort)(Pages - 1))), TiffLoop.Samples(reader, Pages - 1));
        long frames = GC.GetAllocatedBytesForCurrentThread();
        for (int f = 0; f < Pages; f++)
            reader.Layout(f);
        Assert.InRange(GC.GetAllocatedBytesForCurrentThread() - frames, 0, 1000);
    }
}
