using Stacks.Abstractions;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

/// <summary>Every sample type, layout, compression and predictor in every container, against the slow writer.</summary>
public sealed class ReadTests
{
    public static TheoryData<bool, bool> Containers => new() { { false, false }, { false, true }, { true, false }, { true, true } };

    [Theory]
    [MemberData(nameof(Containers))]
    public void Every_type_layout_compression_and_predictor_is_read(bool big, bool bigEndian)
    {
        using TemporaryFolder folder = new();
        foreach ((SampleType type, int bits, int format) in TinyFiles.Types)
        {
            List<TinyPage> pages = [];
            foreach (int compression in (int[])[1, 5, 8, 32773, 32946, 50000])
            {
                foreach (int predictor in format == 3 ? (int[])[1, 2, 3] : [1, 2])
                {
                    if (compression is 1 or 32773 && predictor != 1)
                        continue;
                    TinyPage page = TinyFiles.Page(21, 11, bits, format, pages.Count) with { Compression = compression, Predictor = predictor };
                    pages.Add(page);
                    pages.Add(page with { Tile = (16, 16) });
                    pages.Add(page with { RowsPerStrip = 100 });
                }
            }

            using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(big, bigEndian, [.. pages]));
            Assert.Equal(pages.Count, reader.FrameCount);
            for (int f = 0; f < pages.Count; f++)
            {
                Assert.Equal((21, 11, type), (reader.Layout(f).Width, reader.Layout(f).Height, reader.Layout(f).SampleType));
                Assert.True(pages[f].Samples.AsSpan().SequenceEqual(TiffLoop.Samples(reader, f)), $"{type}, compression {pages[f].Compression}, predictor {pages[f].Predictor}, tile {pages[f].Tile}");
            }
        }
    }

    /// <summary>Each sample of a pixel is a frame, whose channel is the sample's number, whether samples stand side by side or in planes.</summary>
    [Theory]
    [MemberData(nameof(Containers))]
    public void Every_sample_of_a_pixel_is_a_frame(bool big, bool bigEndian)
    {
        using TemporaryFolder folder = new();
        foreach ((SampleType type, int bits, int format) in TinyFiles.Types)
        {
            List<TinyPage> pages = [];
            foreach (int compression in (int[])[1, 5, 8, 32773, 50000])
            {
                foreach (int predictor in compression is 1 or 32773 ? (int[])[1] : format == 3 ? [1, 2, 3] : [1, 2])
                {
                    foreach (bool planar in (bool[])[false, true])
                    {
                        TinyPage page = TinyFiles.Page(21, 11, bits, format, pages.Count, 2 + (pages.Count % 4)) with { Compression = compression, Predictor = predictor, Planar = planar };
                        pages.AddRange([page, page with { Tile = (16, 16) }, page with { RowsPerStrip = 100 }]);
                    }
                }
            }

            using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(big, bigEndian, [.. pages]));
            Assert.Equal(pages.Sum(p => p.PerPixel), reader.FrameCount);
            int frame = 0;
            foreach (TinyPage page in pages)
            {
                int plane = page.Samples.Length / page.PerPixel;
                for (int s = 0; s < page.PerPixel; s++, frame++)
                {
                    Assert.Equal((type, s), (reader.Layout(frame).SampleType, reader.Layout(frame).Channel));
                    Assert.True(
                        page.Samples.AsSpan(s * plane, plane).SequenceEqual(TiffLoop.Samples(reader, frame)),
                        $"{type}, compression {page.Compression}, predictor {page.Predictor}, tile {page.Tile}, planar {page.Planar}, sample {s} of {page.PerPixel}");
                }
            }
        }
    }

    /// <summary>TIFF 6.0, section 14: the predictor belongs to the compression; a field left from elsewhere means nothing.</summary>
    [Fact]
    public void Predictor_without_compression_is_ignored()
    {
        using TemporaryFolder folder = new();
        TinyPage page = TinyFiles.Page() with { Extra = [new(317, 3, 2)] };
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, page));
        Assert.Equal(page.Samples, TiffLoop.Samples(reader, 0));
    }

    [Fact]
    public void Missing_byte_counts_are_known_without_compression()
    {
        using TemporaryFolder folder = new();
        byte[] bytes = TinyTiff.Build(false, false, TinyFiles.Page());
        int entry = bytes.AsSpan().IndexOf((ReadOnlySpan<byte>)[0x17, 0x01, 4, 0]);
        bytes[entry] = 0x16;
        bytes[entry + 1] = 0x7F;
        using IStackReader reader = TinyFiles.Open(folder, bytes);
        Assert.Equal(TinyFiles.Page().Samples, TiffLoop.Samples(reader, 0));
    }

    [Fact]
    public void Saturation_and_step_follow_the_type()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(
            false, false, [.. TinyFiles.Types.Select(t => TinyFiles.Page(bits: t.Bits, format: t.Format) with { Extra = [new(281, 3, 100)] })]));
        double?[] expected = [255, 127, 65535, 32767, 4294967295, 2147483647, 18446744073709551615, 9223372036854775807, null, null, null];
        for (int f = 0; f < expected.Length; f++)
        {
            Assert.Equal(expected[f], reader.Layout(f).SaturationStored);
            Assert.Equal(expected[f] is null ? 0 : 1, reader.Layout(f).QuantisationStep);
        }
    }

    /// <summary>TIFF/EP (ISO 12234-2): CFARepeatPatternDim is rows, then columns.</summary>
    [Fact]
    public void Colour_filter_mosaic_gives_the_lattice()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(
            false,
            true,
            TinyFiles.Page() with { Extra = [new(262, 3, 32803), new(33421, 3, 4, 2), new(33422, 1, 0, 1, 2, 1, 0, 1, 2, 1)] },
            TinyFiles.Page() with { Extra = [new(262, 3, 32803)] },
            TinyFiles.Page()));
        Assert.Equal(new Lattice(2, 4), reader.Layout(0).Lattice);
        Assert.Equal(new Lattice(2, 2), reader.Layout(1).Lattice);
        Assert.True(reader.Layout(2).Lattice.IsSingle);
    }

    [Fact]
    public void White_is_zero_is_read_as_stored_and_said()
    {
        using TemporaryFolder folder = new();
        TinyPage page = TinyFiles.Page() with { Extra = [new(262, 3, 0)] };
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, page));
        Assert.Equal(page.Samples, TiffLoop.Samples(reader, 0));
        Assert.Contains(reader.Facts, f => f.Value.Contains("white is zero", StringComparison.Ordinal));
    }

    [Fact]
    public void Alike_pages_share_their_layout_and_40000_pages_are_found()
    {
        // Beyond 32,767 pages a short page number would overflow.
        using TemporaryFolder folder = new();
        byte[] bytes = ManyPages.Build(40000, big: false);
        using IStackReader reader = TinyFiles.Open(folder, bytes);
        Assert.Equal(40000, reader.FrameCount);
        Assert.Same(reader.Layout(0), reader.Layout(39999));
        Assert.Equal([0x3F, 0x9C], TiffLoop.Samples(reader, 39999));
    }

    [Fact]
    public void Concurrent_reads_give_the_same_samples()
    {
        using TemporaryFolder folder = new();
        TinyPage[] pages = [.. Enumerable.Range(0, 40).Select(i => TinyFiles.Page(33, 29, seed: i) with { Compression = i % 2 == 0 ? 8 : 5, Predictor = 2 })];
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, true, pages));
        Parallel.For(0, 400, i => Assert.Equal(pages[i % 40].Samples, TiffLoop.Samples(reader, i % 40)));
    }
}
