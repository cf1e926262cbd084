using System.IO.Compression;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Tests.Cli;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Gzipped files are read as what they hold; the base library's gzip made them.</summary>
public sealed class GzipTests : IDisposable
{
    private const int Width = 200;
    private const int Height = 150;
    private const int Frames = 5; // their last block is not full: the stream gives no byte that stands before a wrong checksum

    private static readonly byte[] Plain = SmallFiles.Fits(Width, Height, Frames, (x, y, f) => (x * x) + (3 * y) + (1000 * f));
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    [Theory]
    [InlineData(1)]
    [InlineData(3)]
    public void Frames_in_any_order_and_from_many_threads(int members)
    {
        byte[] gzipped = [.. Plain.Chunk((Plain.Length / members) + 1).SelectMany(Gzip)];
        using IStackReader expected = Open(Plain, "a.fits"), reader = Open(gzipped, "b.fits.gz");

        Assert.Equal((Frames, expected.Layout(0)), (reader.FrameCount, reader.Layout(0)));
        foreach (int frame in new[] { 0, 1, 2, 4, 0, 4, 3, 3 })
            Assert.Equal(PassThrough.Stored(expected, frame), PassThrough.Stored(reader, frame));
        Parallel.For(0, 40, i => Assert.Equal(PassThrough.Stored(expected, i % Frames), PassThrough.Stored(reader, i % Frames)));
        Assert.DoesNotContain(reader.CheckHealth(CancellationToken.None), f => f.IsProblem);
    }

    /// <summary>The result's samples and header are those of the plain file's result; only the source's name and digest differ.</summary>
    [Fact]
    public void A_run_writes_a_plain_file_of_the_plain_name()
    {
        using CliBench bench = new();
        ToolResult result = bench.Run(bench.Recipe(), bench.Put("a.fits.gz", Gzip(Plain)));

        Assert.Equal(0, result.ExitCode);
        int[] expected = [.. from f in Enumerable.Range(0, Frames) from y in Enumerable.Range(0, Height) from x in Enumerable.Range(0, Width) select (x * x) + (3 * y) + (1000 * f)];
        Assert.Equal(expected, SmallFiles.SamplesOf(Path.Combine(bench.Out, "a.fits"), expected.Length));
    }

    [Fact]
    public void A_cut_stream_keeps_its_whole_frames()
    {
        byte[] gzipped = Gzip(Plain);
        byte[] cut = gzipped[..(gzipped.Length / 2)];

        Assert.Contains("--salvage", Assert.Throws<StackFormatException>(() => Open(cut, "a.fits.gz").Dispose()).Message, StringComparison.Ordinal);
        using IStackReader expected = Open(Plain, "b.fits"), reader = Open(cut, "c.fits.gz", allowTruncated: true);
        Assert.InRange(reader.FrameCount, 1, Frames - 1);
        for (int frame = 0; frame < reader.FrameCount; frame++)
            Assert.Equal(PassThrough.Stored(expected, frame), PassThrough.Stored(reader, frame));
        Assert.Contains(reader.Losses, loss => loss.StartsWith($"frames {reader.FrameCount} to {Frames - 1} are missing", StringComparison.Ordinal));
    }

    [Fact]
    public void A_wrong_checksum_is_named()
    {
        byte[] changed = Gzip(Plain);
        changed[^6] ^= 1; // RFC 1952: CRC32 and ISIZE are the last eight bytes.

        Assert.Contains("the gzip stream is damaged", Assert.Throws<StackFormatException>(() => Open(changed, "a.fits.gz").Dispose()).Message, StringComparison.Ordinal);
        using IStackReader reader = Open(changed, "b.fits.gz", allowTruncated: true);
        Assert.Equal(Frames, reader.FrameCount);
        PassThrough.Stored(reader, Frames - 1);
        Assert.Contains(reader.Losses, loss => loss.Contains("the gzip stream is damaged", StringComparison.Ordinal));
        Assert.Contains(reader.CheckHealth(CancellationToken.None), f => f.IsProblem && f.Text.Contains("gzip", StringComparison.Ordinal));
    }

    [Fact]
    public void Any_byte_may_be_wrong()
    {
        byte[] gzipped = Gzip(SmallFiles.Fits(8, 6, 2, CliBench.Sample));
        using IStackReader expected = Open(SmallFiles.Fits(8, 6, 2, CliBench.Sample), "a.fits");
        for (int at = 0; at < gzipped.Length; at++)
        {
            byte[] changed = [.. gzipped];
            changed[at] ^= 0x55;
            try
            {
                using IStackReader reader = Open(changed, "b.fits.gz");
                for (int frame = 0; frame < 2; frame++)
                    Assert.Equal(PassThrough.Stored(expected, frame), PassThrough.Stored(reader, frame));
            }
            catch (StackFormatException error)
            {
                Assert.Contains("b.fits.gz", error.Message, StringComparison.Ordinal);
            }
        }
    }

    /// <summary>2 GB of zeros behind an END card: nothing of them is kept, and what belongs to no HDU is counted up to a bound.</summary>
    [Fact]
    public void A_file_that_inflates_to_far_more_than_memory_is_streamed()
    {
        string path = folder.File("bomb.fits.gz");
        using (GZipStream gzip = new(File.Create(path), CompressionLevel.Fastest))
        {
            gzip.Write(Plain);
            byte[] zeros = new byte[1 << 20];
            for (int i = 0; i < 2048; i++)
                gzip.Write(zeros);
        }

        long before = GC.GetAllocatedBytesForCurrentThread();
        using IStackReader reader = new FitsFormat().Open(path, new ReadOptions());
        Assert.Equal(Frames, reader.FrameCount);
        PassThrough.Stored(reader, Frames - 1);
        Assert.True(GC.GetAllocatedBytesForCurrentThread() - before < 8 << 20);
    }

    /// <summary>A promise that no gzip stream of this length can keep is refused before anything is inflated for it.</summary>
    [Theory]
    [InlineData(false)]
    [InlineData(true)]
    public void Headers_that_promise_more_than_gzip_can_hold_are_refused_at_once(bool salvage)
    {
        byte[] file = new FitsBytes().Primary(16, [30000, 30000, 1_000_000_000], new byte[1 << 20]).ToArray();

        long before = GC.GetAllocatedBytesForCurrentThread();
        Assert.Contains("cannot hold more than", Assert.Throws<StackFormatException>(() => Open(Gzip(file), "a.fits.gz", salvage).Dispose()).Message, StringComparison.Ordinal);
        Assert.True(GC.GetAllocatedBytesForCurrentThread() - before < 8 << 20);
    }

    private IStackReader Open(byte[] bytes, string name, bool allowTruncated = false)
    {
        File.WriteAllBytes(folder.File(name), bytes);
        return new FitsFormat().Open(folder.File(name), new ReadOptions { AllowTruncated = allowTruncated });
    }

    private static byte[] Gzip(byte[] bytes)
    {
        MemoryStream stream = new();
        using (GZipStream gzip = new(stream, CompressionLevel.Fastest))
            gzip.Write(bytes);
        return stream.ToArray();
    }
}
