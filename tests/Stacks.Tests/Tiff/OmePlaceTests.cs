using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

/// <summary>Planes keep their places where a page holds several samples a pixel, and where a result lacks pages of its source.</summary>
public sealed class OmePlaceTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    /// <summary>
    /// OME schema 2016-06: SizeC counts the samples of all channels, so that a channel of three samples is one page; the pages
    /// of two places along z follow each other.
    /// </summary>
    [Theory]
    [InlineData("""<TiffData IFD="0" PlaneCount="2"/>""")]
    [InlineData("<TiffData/>")]
    [InlineData("""<TiffData IFD="0"/><TiffData IFD="1" FirstZ="1"/>""")]
    public void Samples_of_a_pixel_are_channels_that_follow_each_other(string links)
    {
        TinyPage[] pages = [Described($"""{Pixels(3, 2)}<Channel ID="Channel:0:0" Name="stain" SamplesPerPixel="3"/>{links}""", 3), TinyFiles.Page(perPixel: 3, seed: 2)];
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, pages));
        Assert.Equal("C0Z0 C1Z0 C2Z0 C0Z1 C1Z1 C2Z1", Places(reader));
        Assert.All(Enumerable.Range(0, 6), f => Assert.Equal("stain", reader.Layout(f).ChannelName));
    }

    [Fact]
    public void Two_channels_of_three_samples_are_six()
    {
        TinyPage[] pages =
        [
            Described($"""{Pixels(6, 2)}<Channel ID="Channel:0:0" Name="a" SamplesPerPixel="3"/><Channel ID="Channel:0:1" Name="b" SamplesPerPixel="3"/><TiffData/>""", 3),
            .. Enumerable.Range(2, 3).Select(i => TinyFiles.Page(perPixel: 3, seed: i)),
        ];
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, pages));
        Assert.Equal("C0Z0 C1Z0 C2Z0 C3Z0 C4Z0 C5Z0 C0Z1 C1Z1 C2Z1 C3Z1 C4Z1 C5Z1", Places(reader));
        Assert.Equal("aaabbbaaabbb", string.Concat(Enumerable.Range(0, 12).Select(f => reader.Layout(f).ChannelName)));
    }

    /// <summary>The text numbers pages of the file it stands in; a result without the thumbnail has other numbers.</summary>
    [Theory]
    [InlineData("""<TiffData IFD="0"/><TiffData IFD="2" FirstZ="1" PlaneCount="2"/>""")]
    [InlineData("""<TiffData IFD="0"><UUID FileName="in.tif">urn:uuid:here</UUID></TiffData><TiffData IFD="2" FirstZ="1" PlaneCount="2"><UUID FileName="in.tif">urn:uuid:here</UUID></TiffData>""")]
    public void A_result_without_a_thumbnail_has_its_planes_at_their_places(string links)
    {
        TinyPage[] pages =
        [
            Described(Pixels(1, 3) + links), TinyFiles.Page(seed: 2) with { Extra = [new(254, 4, 1)] }, TinyFiles.Page(seed: 3), TinyFiles.Page(seed: 4),
        ];
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, pages));
        Assert.Equal("C0Z0 C0Z1 C0Z2", Places(reader));
        foreach (bool carry in new[] { true, false })
        {
            using IStackReader result = new TiffFormat().Open(TiffLoop.Copy(reader, folder.File($"out{carry}.tif"), carry: carry)[0], new ReadOptions());
            Assert.Equal("C0Z0 C0Z1 C0Z2", Places(result));
            Assert.DoesNotContain(result.CheckHealth(default), f => f.IsProblem);
        }
    }

    [Fact]
    public void A_salvaged_stack_has_its_planes_at_their_places()
    {
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, Described(Pixels(1, 3) + "<TiffData/>"), CutOff, TinyFiles.Page(seed: 3)), allowTruncated: true);
        Assert.Equal("C0Z0 C0Z2", Places(reader));
        using IStackReader result = new TiffFormat().Open(TiffLoop.Copy(reader, folder.File("out.tif"))[0], new ReadOptions());
        Assert.Equal("C0Z0 C0Z2", Places(result));
    }

    /// <summary>One element of the set covers three pages of a file, the middle one of which is cut off.</summary>
    [Fact]
    public void A_salvaged_set_has_its_planes_at_their_places()
    {
        string text = Pixels(2, 3, "XYZCT") + """
            <TiffData IFD="0" PlaneCount="3"><UUID FileName="in.tif">urn:uuid:here</UUID></TiffData>
            <TiffData IFD="0" FirstC="1" PlaneCount="3"><UUID FileName="other.tif">urn:uuid:other</UUID></TiffData>
            """;
        File.WriteAllBytes(folder.File("other.tif"), TinyTiff.Build(false, false, TinyFiles.Page(seed: 4), CutOff, TinyFiles.Page(seed: 5)));
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, Described(text), CutOff, TinyFiles.Page(seed: 3)), allowTruncated: true);
        Assert.Equal("C0Z0 C0Z2 C1Z0 C1Z2", Places(reader));
        using IStackReader result = new TiffFormat().Open(TiffLoop.Copy(reader, folder.File("out.tif"))[0], new ReadOptions());
        Assert.Equal(Places(reader), Places(result));
    }

    /// <summary>A page whose image data reach beyond the end of the file.</summary>
    private static TinyPage CutOff => TinyFiles.Page(seed: 2) with { Compression = 8, Extra = [new(279, 4, 1 << 20, 1 << 20)] };

    private static string Pixels(int c, int z, string order = "XYCZT") =>
        $"""<Pixels ID="Pixels:0" DimensionOrder="{order}" Type="uint16" SizeX="7" SizeY="5" SizeC="{c}" SizeZ="{z}" SizeT="1">""";

    private static TinyPage Described(string pixels, int perPixel = 1) => TinyFiles.Page(perPixel: perPixel) with
    {
        Extra = [TinyTag.Text(270, $"""<OME xmlns="{OmeSetFiles.Schema}" UUID="urn:uuid:here"><Image ID="Image:0">{pixels}</Pixels></Image></OME>""")],
    };

    private static string Places(IStackReader reader) =>
        string.Join(' ', Enumerable.Range(0, reader.FrameCount).Select(f => $"C{reader.Layout(f).Channel}Z{reader.Layout(f).Z}"));
}
