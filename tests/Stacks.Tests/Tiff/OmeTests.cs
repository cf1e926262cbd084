using System.Text;
using System.Xml.Linq;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

public sealed class OmeTests
{
    private const string Schema = "http://www.openmicroscopy.org/Schemas/OME/2016-06";
    private static readonly XNamespace Ome = Schema;

    /// <summary>The four fragments of the OME-TIFF specification, section "The TiffData element", and their tables.</summary>
    [Theory]
    [InlineData("""DimensionOrder="XYZTC" SizeZ="3" SizeT="2" SizeC="2"><TiffData/>""", 14, "Z0T0C0 Z1T0C0 Z2T0C0 Z0T1C0 Z1T1C0 Z2T1C0 Z0T0C1 Z1T0C1 Z2T0C1 Z0T1C1 Z1T1C1 Z2T1C1 - -")]
    [InlineData("""DimensionOrder="XYCTZ" SizeZ="4" SizeT="3" SizeC="2"><TiffData PlaneCount="10"/>""", 11, "Z0T0C0 Z0T0C1 Z0T1C0 Z0T1C1 Z0T2C0 Z0T2C1 Z1T0C0 Z1T0C1 Z1T1C0 Z1T1C1 -")]
    [InlineData("""DimensionOrder="XYZTC" SizeZ="4" SizeC="3" SizeT="2"><TiffData IFD="3" PlaneCount="5"/>""", 9, "- - - Z0T0C0 Z1T0C0 Z2T0C0 Z3T0C0 Z0T1C0 -")]
    [InlineData("""DimensionOrder="XYZTC" SizeZ="1" SizeC="1" SizeT="6"><TiffData IFD="0" FirstT="5"/><TiffData IFD="1" FirstT="4"/><TiffData IFD="2" FirstT="3"/><TiffData IFD="3" FirstT="2"/><TiffData IFD="4" FirstT="1"/><TiffData IFD="5" FirstT="0"/>""", 6, "Z0T5C0 Z0T4C0 Z0T3C0 Z0T2C0 Z0T1C0 Z0T0C0")]
    public void Planes_follow_the_examples_of_the_specification(string pixels, int pages, string expected)
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, $"""<OME xmlns="{Schema}"><Image ID="Image:0"><Pixels Type="uint16" {pixels}</Pixels></Image></OME>""", pages);
        Assert.Equal(expected, string.Join(' ', Enumerable.Range(0, pages).Select(f => Place(reader.Layout(f)))));
    }

    /// <summary>All six orders, from the definition: the first letter after XY runs fastest.</summary>
    [Theory]
    [InlineData("XYZCT", "Z0T0C0 Z1T0C0 Z0T0C1 Z1T0C1 Z0T0C2 Z1T0C2 Z0T1C0")]
    [InlineData("XYZTC", "Z0T0C0 Z1T0C0 Z0T1C0 Z1T1C0 Z0T0C1 Z1T0C1 Z0T1C1")]
    [InlineData("XYCZT", "Z0T0C0 Z0T0C1 Z0T0C2 Z1T0C0 Z1T0C1 Z1T0C2 Z0T1C0")]
    [InlineData("XYCTZ", "Z0T0C0 Z0T0C1 Z0T0C2 Z0T1C0 Z0T1C1 Z0T1C2 Z1T0C0")]
    [InlineData("XYTCZ", "Z0T0C0 Z0T1C0 Z0T0C1 Z0T1C1 Z0T0C2 Z0T1C2 Z1T0C0")]
    [InlineData("XYTZC", "Z0T0C0 Z0T1C0 Z1T0C0 Z1T1C0 Z0T0C1 Z0T1C1 Z1T0C1")]
    public void Every_dimension_order_is_understood(string order, string expected)
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, $"""<OME xmlns="{Schema}"><Image ID="Image:0"><Pixels Type="uint16" DimensionOrder="{order}" SizeZ="2" SizeT="2" SizeC="3"><TiffData/></Pixels></Image></OME>""", 7);
        Assert.Equal(expected, string.Join(' ', Enumerable.Range(0, 7).Select(f => Place(reader.Layout(f)))));
    }

    [Fact]
    public void Channels_scales_and_significant_bits_are_read()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, Sample, 4);
        Assert.Equal(["DAPI µ", "DAPI µ", null, null], Enumerable.Range(0, 4).Select(f => reader.Layout(f).ChannelName));
        Assert.Equal(4095, reader.Layout(0).SaturationStored);
        Assert.Equal(1, reader.Layout(0).QuantisationStep);
        Assert.Contains(new HeaderFact("pixel width", "0.65 µm"), reader.Facts);
        Assert.Contains(new HeaderFact("time step", "2.5 s"), reader.Facts);
        Assert.Contains(new HeaderFact("taken", "2020-01-02T03:04:05"), reader.Facts);
        Assert.DoesNotContain(reader.CheckHealth(default), f => f.IsProblem);
    }

    [Fact]
    public void Result_keeps_the_text_and_gains_a_valid_annotation()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, Sample, 4);
        string text = Result(folder, reader, SampleType.UInt16);

        // Without the new UUIDs, the new file name and the annotation it is the source's text.
        XElement annotation = Annotation(text);
        string own = annotation.Attribute("ID")!.Value;
        int start = text.IndexOf("<StructuredAnnotations xmlns", StringComparison.Ordinal);
        int end = text.IndexOf("</StructuredAnnotations>", StringComparison.Ordinal) + "</StructuredAnnotations>".Length;
        string uuid = XDocument.Parse(text).Root!.Attribute("UUID")!.Value;
        Assert.Equal(Sample, (text[..start] + text[end..]).Replace(uuid, "urn:uuid:11111111-2222-3333-4444-555555555555", StringComparison.Ordinal).Replace("out.ome.tif", "in.tif", StringComparison.Ordinal));
        Assert.Equal(4, Count(text, uuid));
        Assert.NotEqual("urn:uuid:11111111-2222-3333-4444-555555555555", uuid);
        Assert.Matches("^urn:uuid:[0-9a-f]{8}-[0-9a-f]{4}-8[0-9a-f]{3}-[89ab][0-9a-f]{3}-[0-9a-f]{12}$", uuid);

        // Order of the 2016-06 schema: Image, StructuredAnnotations, ROI; Description before Value; ID as its pattern says.
        Assert.Equal(["Image", "StructuredAnnotations", "ROI"], XDocument.Parse(text).Root!.Elements().Select(e => e.Name.LocalName));
        Assert.Equal([Ome + "Description", Ome + "Value"], annotation.Elements().Select(e => e.Name));
        Assert.Matches(@"^Annotation:\S+$", own);
        Assert.Equal("urn:stacks:provenance:1", annotation.Attribute("Namespace")!.Value);
        CheckRecord(annotation.Descendants().Single(e => e.Name.LocalName == "Provenance"), 4);
    }

    [Fact]
    public void New_sample_type_is_stated()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, Sample, 4);
        string text = Result(folder, reader, SampleType.Float32);
        XElement pixels = XDocument.Parse(text).Descendants(Ome + "Pixels").Single();
        Assert.Equal(("float", "32"), (pixels.Attribute("Type")!.Value, pixels.Attribute("SignificantBits")!.Value));
        Assert.Contains("DAPI µ", text, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("<StructuredAnnotations><CommentAnnotation ID=\"Annotation:7\"><Value>x</Value></CommentAnnotation></StructuredAnnotations>", 2)]
    [InlineData("<StructuredAnnotations\n />", 1)]
    [InlineData("<StructuredAnnotations></StructuredAnnotations>", 1)]
    public void Existing_annotations_are_joined(string annotations, int expected)
    {
        using TemporaryFolder folder = new();
        string source = $"""<?xml version="1.0" encoding="UTF-8"?><OME xmlns="{Schema}"><Image ID="Image:0"><Pixels Type="uint16" DimensionOrder="XYZCT" SizeZ="1" SizeT="2" SizeC="1"><TiffData/></Pixels></Image>{annotations}</OME>""";
        using IStackReader reader = Open(folder, source, 2);
        string text = Result(folder, reader, SampleType.UInt16);
        Assert.Equal(expected, XDocument.Parse(text).Root!.Elements(Ome + "StructuredAnnotations").Single().Elements().Count());
    }

    [Fact]
    public void A_result_that_is_cleaned_again_has_both_annotations()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, Sample, 4);
        string once = TiffLoop.Copy(reader, folder.File("once.ome.tif"))[0];
        using IStackReader second = new TiffFormat().Open(once, new ReadOptions());
        string text = Result(folder, second, SampleType.UInt16);
        List<XElement> all = [.. XDocument.Parse(text).Descendants(Ome + "XMLAnnotation")];
        Assert.Equal(2, all.Select(e => e.Attribute("ID")!.Value).Distinct().Count());
        Assert.Equal(2, all.Count);
    }

    [Fact]
    public void Earlier_schemas_have_annotations_in_a_namespace_of_their_own_and_prefixes_stay()
    {
        using TemporaryFolder folder = new();
        const string Old = "http://www.openmicroscopy.org/Schemas/OME/2013-06";
        string source = $"""<o:OME xmlns:o="{Old}"><o:Image ID="Image:0"><o:Pixels Type='uint16' DimensionOrder="XYZCT" SizeZ="1" SizeT="2" SizeC="1"><o:TiffData/></o:Pixels></o:Image></o:OME>""";
        using IStackReader reader = Open(folder, source, 2);
        Assert.Equal("Z0T1C0", Place(reader.Layout(1)));
        string text = Result(folder, reader, SampleType.Float64);
        XElement root = XDocument.Parse(text).Root!;
        Assert.Equal("{http://www.openmicroscopy.org/Schemas/SA/2013-06}StructuredAnnotations", root.Elements().Last().Name.ToString());
        Assert.Contains("Type='double'", text, StringComparison.Ordinal);
    }

    [Fact]
    public void Latin_1_and_other_declared_encodings_become_UTF_8()
    {
        using TemporaryFolder folder = new();
        string source = Sample.Replace("UTF-8", "ISO-8859-1", StringComparison.Ordinal);
        TinyPage page = TinyFiles.Page() with { Extra = [new(270, 2, [.. Encoding.Latin1.GetBytes(source + "\0").Select(b => (long)b)])] };
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, page, TinyFiles.Page(), TinyFiles.Page(), TinyFiles.Page()));
        Assert.Equal("DAPI µ", reader.Layout(0).ChannelName);
        string text = Result(folder, reader, SampleType.UInt16);
        Assert.Contains("encoding=\"UTF-8\"", text, StringComparison.Ordinal);
        Assert.Contains("DAPI µ", text, StringComparison.Ordinal);
    }

    [Fact]
    public void Lines_are_counted_as_the_reader_counts_them()
    {
        // CR LF, CR and LF, in tags, attribute values and texts, before every place that is rewritten.
        using TemporaryFolder folder = new();
        string source = $"<OME\r\n xmlns=\"{Schema}\"\r UUID=\"urn:uuid:a\">\n\r<!-- a\r\nb\rc -->\r\n<Image\rName=\"x\r\ny\n>\"><Pixels\n DimensionOrder=\"XYZCT\"\r\n\r\n SizeZ=\"1\" SizeT=\"2\" SizeC=\"1\"\r Type=\"uint16\" SignificantBits=\"12\"><TiffData\r/></Pixels\r\n>\r</Image\r\n >\r\r</OME>";
        using IStackReader reader = Open(folder, source, 2);
        string text = Result(folder, reader, SampleType.Float32);
        Assert.Contains("\r Type=\"float\" SignificantBits=\"32\">", text, StringComparison.Ordinal);
        Assert.Contains("</Image\r\n ><StructuredAnnotations", text, StringComparison.Ordinal);
        Assert.DoesNotContain("urn:uuid:a\"", text, StringComparison.Ordinal);
        Assert.StartsWith("<OME\r\n xmlns=\"" + Schema + "\"\r UUID=\"urn:uuid:", text, StringComparison.Ordinal);
    }

    [Fact]
    public void Of_a_set_whose_other_files_are_gone_the_planes_here_are_there_to_be_salvaged()
    {
        using TemporaryFolder folder = new();
        string source = $"""
            <OME xmlns="{Schema}" UUID="urn:uuid:here"><Image ID="Image:0"><Pixels Type="uint16" DimensionOrder="XYZCT" SizeZ="1" SizeT="2" SizeC="2">
            <TiffData IFD="0" FirstC="1"><UUID FileName="in.tif"> urn:uuid:here </UUID></TiffData>
            <TiffData IFD="1" FirstC="1" FirstT="1"><UUID FileName="renamed.tif">urn:uuid:here</UUID></TiffData>
            <TiffData IFD="0"><UUID FileName="gone.ome.tif">urn:uuid:there</UUID></TiffData>
            </Pixels></Image></OME>
            """;
        Assert.Contains("gone.ome.tif", Assert.Throws<StackFormatException>(() => Open(folder, source, 2)).Message, StringComparison.Ordinal);
        using IStackReader reader = new TiffFormat().Open(folder.File("in.tif"), new ReadOptions { AllowTruncated = true });
        Assert.Equal(["Z0T0C1", "Z0T1C1"], Enumerable.Range(0, 2).Select(f => Place(reader.Layout(f))));
        Assert.Contains("gone.ome.tif", Assert.Single(reader.Losses), StringComparison.Ordinal);

        string companion = $"""<OME xmlns="{Schema}" UUID="urn:uuid:b"><BinaryOnly MetadataFile="all.companion.ome" UUID="urn:uuid:c"/></OME>""";
        Assert.Contains("all.companion.ome", Assert.Throws<StackFormatException>(() => Open(folder, companion, 2)).Message, StringComparison.Ordinal);
        using IStackReader binary = new TiffFormat().Open(folder.File("in.tif"), new ReadOptions { AllowTruncated = true });
        Assert.Null(binary.Layout(0).Channel);
        Assert.Contains(binary.CheckHealth(default), f => f.IsProblem && f.Text.Contains("all.companion.ome", StringComparison.Ordinal));
        string path = TiffLoop.Copy(binary, folder.File("binary.tif"))[0];
        using TiffReader again = TiffReader.OpenAlone(new TiffFormat(), path, new ReadOptions());
        Assert.Equal(companion, Fields.Text(again, 0, 270));
        Assert.NotNull(Fields.Bytes(again, 0, 700));
    }

    [Fact]
    public void Channels_of_one_image_cannot_have_two_types()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, Sample, 4);
        Assert.Throws<OutputException>(() => TiffLoop.Copy(reader, folder.File("o.tif"), typeOf: f => f < 2 ? SampleType.Float32 : SampleType.UInt16));
    }

    [Theory]
    [InlineData("<OME")]
    [InlineData("<OME xmlns=\"http://www.openmicroscopy.org/Schemas/OME/2016-06\"><Image></OME>")]
    [InlineData("<!DOCTYPE OME [<!ENTITY a \"aaaaaaaaaa\">]><OME>&a;</OME>")]
    public void Broken_XML_is_said_and_the_pages_are_plain(string text)
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, text, 2);
        Assert.Null(reader.Layout(0).Channel);
        Assert.Contains(reader.CheckHealth(default), f => f.IsProblem && f.Text.Contains("OME-XML", StringComparison.Ordinal));
        TiffLoop.Copy(reader, folder.File("o.tif"));
    }

    [Fact]
    public void Hostile_sizes_and_depths_end()
    {
        using TemporaryFolder folder = new();
        string images = string.Concat(Enumerable.Repeat("<Image><Pixels DimensionOrder=\"XYZCT\" SizeT=\"2147483647\" SizeC=\"2147483647\" SizeZ=\"2147483647\"><TiffData FirstT=\"2147483646\"/><TiffData/></Pixels></Image>", 5000));
        using IStackReader many = Open(folder, $"<OME>{images}</OME>", 300);
        Assert.Equal(0, many.Layout(0).Channel);
        using IStackReader deep = Open(folder, "<OME>" + string.Concat(Enumerable.Repeat("<a>", 100000)) + string.Concat(Enumerable.Repeat("</a>", 100000)) + "</OME>", 1, "deep.tif");
        Assert.Null(deep.Layout(0).Channel);
    }

    /// <summary>Checks a record against the run of <see cref="TiffLoop"/>.</summary>
    internal static void CheckRecord(XElement record, int frames)
    {
        string Value(string name) => record.Elements().Single(e => e.Name.LocalName == name).Value;
        Assert.Equal("A title with <, & and µ", Value("RecipeTitle"));
        Assert.Equal("0123456789abcdef0123456789abcdef0123456789abcdef0123456789abcdef", Value("WorkSha256"));
        Assert.Equal("70", Value("ReplacedBright"));
        Assert.Equal("0.25", Value("FluxRemoved"));
        string[] ledger = Value("Ledger").Split('\n');
        Assert.Equal(frames + 1, ledger.Length);
        string[] columns = ledger[0].Split(' ');
        string[] row = ledger[2].Split(' ');
        Assert.Equal(15, columns.Length);
        Assert.Equal(15, row.Length);
        Assert.Equal("1", row[0]);
        Assert.Equal("NaN", row[Array.IndexOf(columns, "noise_after")]);
        Assert.Equal("8", row[Array.IndexOf(columns, "replaced_bright")]);
        Assert.Equal(1e9 / 3, double.Parse(row[Array.IndexOf(columns, "flux_in")], System.Globalization.CultureInfo.InvariantCulture));
    }

    private static string Sample => $"""
        <?xml version="1.0" encoding="UTF-8"?><!-- Please edit cautiously > -->
        <OME xmlns="{Schema}" UUID="urn:uuid:11111111-2222-3333-4444-555555555555" Creator="someone &lt; &amp; µ">
          <Image ID="Image:0" Name="Cells"><AcquisitionDate>2020-01-02T03:04:05</AcquisitionDate>
            <Pixels ID="Pixels:0" DimensionOrder="XYTCZ" Type="uint16" SignificantBits="12" SizeX="7" SizeY="5" SizeZ="1" SizeC="2" SizeT="2" PhysicalSizeX="0.65" PhysicalSizeY="0.65" TimeIncrement="2.5">
              <Channel ID="Channel:0:0" Name="DAPI µ"/><Channel ID="Channel:0:1"/>
              <TiffData IFD="0"><UUID FileName="in.tif">urn:uuid:11111111-2222-3333-4444-555555555555</UUID></TiffData>
              <TiffData IFD="1" FirstT="1"><UUID FileName="in.tif">urn:uuid:11111111-2222-3333-4444-555555555555</UUID></TiffData>
              <TiffData IFD="2" FirstC="1" PlaneCount="2"><UUID FileName="in.tif">urn:uuid:11111111-2222-3333-4444-555555555555</UUID></TiffData>
            </Pixels>
          </Image>
          <ROI ID="ROI:0"/>
        </OME>
        """.ReplaceLineEndings("\n");

    private static IStackReader Open(TemporaryFolder folder, string xml, int pages, string name = "in.tif")
    {
        TinyPage[] all = [.. Enumerable.Range(0, pages).Select(i => TinyFiles.Page(seed: i))];
        all[0] = all[0] with { Extra = [TinyTag.Text(270, xml)] };
        return TinyFiles.Open(folder, TinyTiff.Build(false, false, all), name: name);
    }

    private static string Result(TemporaryFolder folder, IStackReader reader, SampleType type)
    {
        string path = TiffLoop.Copy(
            reader, folder.File("out.ome.tif"), typeOf: _ => type, change: (f, s) => new byte[reader.Layout(f).Length * type.Size()])[0];
        using TiffReader again = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
        Assert.Equal(Place(reader.Layout(1)), Place(again.Layout(1)));
        Assert.DoesNotContain(again.CheckHealth(default), f => f.IsProblem);
        return Fields.Text(again, 0, 270)!;
    }

    private static XElement Annotation(string text) => XDocument.Parse(text).Descendants(Ome + "XMLAnnotation").Single();

    private static string Place(FrameLayout layout) => layout.Z is null ? "-" : $"Z{layout.Z}T{layout.Time}C{layout.Channel}";

    private static int Count(string text, string part) => text.Split(part).Length - 1;
}
