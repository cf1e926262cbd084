using Stacks.Abstractions;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

/// <summary>Truncated stacks: refused, or on request taken with their whole pages, the lost ones named by number and place.</summary>
public sealed class SalvageTests
{
    private static readonly TinyPage[] Pages = [.. Enumerable.Range(0, 5).Select(i => TinyFiles.Page(40, 30, seed: i) with { RowsPerStrip = 10 })];

    /// <summary>Every directory stands before its page's data, so that pages are lost from the end.</summary>
    [Theory]
    [InlineData(false, false)]
    [InlineData(true, true)]
    public void Whole_pages_before_the_cut_are_read_and_the_others_named(bool big, bool bigEndian)
    {
        using TemporaryFolder folder = new();
        byte[] whole = TinyTiff.Build(big, bigEndian, Pages);
        int[] ends = [.. Enumerable.Range(0, 6).Select(n => TinyTiff.Build(big, bigEndian, Pages[..n]).Length)];
        for (int cut = whole.Length - 1; cut > 0; cut -= 97)
        {
            byte[] bytes = whole[..cut];
            Assert.ThrowsAny<StacksException>(() => TinyFiles.Open(folder, bytes).Dispose());
            int expected = Enumerable.Range(0, 6).Last(n => n == 0 || ends[n] <= cut);
            if (expected == 0)
            {
                Assert.ThrowsAny<StacksException>(() => TinyFiles.Open(folder, bytes, allowTruncated: true).Dispose());
                continue;
            }

            using IStackReader reader = TinyFiles.Open(folder, bytes, allowTruncated: true);
            Assert.Equal(expected, reader.FrameCount);
            for (int f = 0; f < expected; f++)
                Assert.Equal(Pages[f].Samples, TiffLoop.Samples(reader, f));
            string loss = Assert.Single(reader.Losses);
            Assert.Contains($"page {expected} ", loss, StringComparison.Ordinal);
            Assert.Contains($"the file ends at byte {cut}", loss, StringComparison.Ordinal);
            Assert.Contains(reader.CheckHealth(default), f => f.IsProblem && f.Text.Contains(loss, StringComparison.Ordinal));
        }
    }

    /// <summary>Directories first: the number of lost pages is known, and whole pages behind lost ones are taken.</summary>
    [Fact]
    public void Whole_pages_after_lost_ones_are_read_too()
    {
        using TemporaryFolder folder = new();
        byte[] whole = TinyTiff.Build(false, false, Pages);

        // The strips of pages 1 and 2 are said to lie beyond the end, as if the file had been written in another order.
        byte[] bytes = [.. whole];
        foreach (int page in (int[])[1, 2])
        {
            int directory = TinyTiff.Build(false, false, Pages[..page]).Length;
            directory += directory % 2;
            int entry = bytes.AsSpan(directory).IndexOf((ReadOnlySpan<byte>)[0x11, 0x01, 4, 0]) + directory;
            int offsets = BitConverter.ToInt32(bytes, entry + 8);
            BitConverter.TryWriteBytes(bytes.AsSpan(offsets + 4), whole.Length - 10);
        }

        using IStackReader reader = TinyFiles.Open(folder, bytes, allowTruncated: true);
        Assert.Equal(3, reader.FrameCount);
        foreach ((int frame, int page) in new[] { (0, 0), (1, 3), (2, 4) })
            Assert.Equal(Pages[page].Samples, TiffLoop.Samples(reader, frame));
        string loss = Assert.Single(reader.Losses);
        Assert.StartsWith("pages 1 to 2 are lost: its strip 1 of 800 bytes should be at byte", loss, StringComparison.Ordinal);
        Assert.Contains(reader.Parts, p => p.Name == "pages 1 to 2" && p.Role == "lost" && p.Fate == "not carried");

        string result = TiffLoop.Copy(reader, folder.File("out.tif"))[0];
        using IStackReader again = new Formats.Tiff.TiffFormat().Open(result, new ReadOptions());
        Assert.Equal(3, again.FrameCount);
        Assert.Empty(again.Losses);
        Assert.Equal(Pages[4].Samples, TiffLoop.Samples(again, 2));
    }
}
