using System.Text;
using System.Xml.Linq;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

/// <summary>XMP packets against ISO 16684-1: the packet wrapper, rdf:Seq for ordered arrays, the fields of ResourceEvent.</summary>
public sealed class XmpTests
{
    private static readonly XNamespace Rdf = "http://www.w3.org/1999/02/22-rdf-syntax-ns#";
    private static readonly XNamespace Media = "http://ns.adobe.com/xap/1.0/mm/";
    private static readonly XNamespace Event = "http://ns.adobe.com/xap/1.0/sType/ResourceEvent#";
    private static readonly XNamespace Own = "urn:stacks:provenance:1";

    [Fact]
    public void New_packet_holds_history_and_record()
    {
        XDocument packet = Packet(null, out byte[] bytes);
        Assert.StartsWith("<?xpacket begin=\"\uFEFF\" id=\"W5M0MpCehiHzreSzNTczkc9d\"?>", Encoding.UTF8.GetString(bytes), StringComparison.Ordinal);
        Assert.EndsWith("<?xpacket end=\"w\"?>", Encoding.UTF8.GetString(bytes), StringComparison.Ordinal);
        List<XElement> events = [.. Events(packet)];
        Assert.Equal(["filtered", "filtered", "saved"], events.Select(e => e.Element(Event + "action")!.Value));
        Assert.All(events, e => Assert.Equal("2024-02-03T04:05:06Z", e.Element(Event + "when")!.Value));
        Assert.Equal("adaptive-median: threshold = 5 sigma; largest_window = 7 px", events[0].Element(Event + "parameters")!.Value);
        Assert.StartsWith("bilateral on channel DAPI: ", events[1].Element(Event + "parameters")!.Value, StringComparison.Ordinal);
        Assert.All(events, e => Assert.StartsWith("stacks 0.1.0", e.Element(Event + "softwareAgent")!.Value, StringComparison.Ordinal));
        XElement run = Runs(packet).Single();
        OmeTests.CheckRecord(run, 2);
        Assert.Equal(2, run.Element(Own + "Step")!.Element(Rdf + "Seq")!.Elements(Rdf + "li").Count());
        Assert.All(packet.Descendants(Rdf + "Description"), d => Assert.Equal("", d.Attribute(Rdf + "about")!.Value));
    }

    [Fact]
    public void Existing_packet_is_kept_and_extended()
    {
        const string Source = """
            <?xpacket begin='' id='W5M0MpCehiHzreSzNTczkc9d'?><x:xmpmeta xmlns:x="adobe:ns:meta/"><rdf:RDF xmlns:rdf="http://www.w3.org/1999/02/22-rdf-syntax-ns#">
            <rdf:Description rdf:about="uuid:1" xmlns:dc="http://purl.org/dc/elements/1.1/" xmlns:m="http://ns.adobe.com/xap/1.0/mm/" xmlns:e="http://ns.adobe.com/xap/1.0/sType/ResourceEvent#">
            <dc:title><rdf:Alt><rdf:li xml:lang="x-default">µ title</rdf:li></rdf:Alt></dc:title>
            <m:History><rdf:Seq><rdf:li rdf:parseType="Resource"><e:action>created</e:action></rdf:li></rdf:Seq></m:History>
            </rdf:Description></rdf:RDF></x:xmpmeta>
            <?xpacket end='w'?>
            """;
        XDocument packet = Packet(Encoding.UTF8.GetBytes(Source + "\0\0"), out byte[] once);
        Assert.Equal(["created", "filtered", "filtered", "saved"], Events(packet).Select(e => e.Element(Event + "action")!.Value));
        Assert.Contains("µ title", packet.ToString(), StringComparison.Ordinal);
        Assert.All(packet.Descendants(Rdf + "Description"), d => Assert.Equal("uuid:1", d.Attribute(Rdf + "about")!.Value));

        XDocument twice = Packet(once, out _);
        Assert.Equal(2, Runs(twice).Count());
        Assert.Equal(7, Events(twice).Count());
        Assert.Single(twice.Descendants(Own + "Runs"));
        Assert.Single(twice.Descendants(Media + "History"));
    }

    [Theory]
    [InlineData("not XML at all")]
    [InlineData("<x:xmpmeta xmlns:x=\"adobe:ns:meta/\"><rdf:RDF")]
    [InlineData("<other/>")]
    public void Packet_that_cannot_be_read_is_kept_in_base64_and_said(string source)
    {
        byte[] bytes = Encoding.UTF8.GetBytes(source);
        XDocument packet = Packet(bytes, out _);
        Assert.Equal(bytes, Convert.FromBase64String(Runs(packet).Single().Element(Own + "UnreadablePacket")!.Value));

        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, TinyFiles.Page() with { Extra = [new(700, 1, [.. bytes.Select(b => (long)b)])] }));
        Assert.Contains(reader.CheckHealth(default), f => f.IsProblem && f.Text.Contains("XMP", StringComparison.Ordinal));
    }

    [Fact]
    public void Characters_that_XML_does_not_allow_are_replaced()
    {
        byte[] bytes = XmpPacket.Make(null, TiffLoop.Record(0) with { SourceName = "a\u0001b\uD800c\uD83D\uDE00.tif" }, []);
        Assert.Contains("a\uFFFDb\uFFFDc\uD83D\uDE00.tif", XDocument.Load(new MemoryStream(bytes)).ToString(), StringComparison.Ordinal);
    }

    private static XDocument Packet(byte[]? source, out byte[] bytes)
    {
        bytes = XmpPacket.Make(source, TiffLoop.Record(2), [TiffLoop.Row(0, new byte[32], new byte[32]), TiffLoop.Row(1, new byte[32], new byte[32])]);
        return XDocument.Load(new MemoryStream(bytes));
    }

    private static IEnumerable<XElement> Events(XDocument packet) => packet.Descendants(Media + "History").Single().Element(Rdf + "Seq")!.Elements(Rdf + "li");

    private static IEnumerable<XElement> Runs(XDocument packet) => packet.Descendants(Own + "Runs").Single().Element(Rdf + "Seq")!.Elements(Rdf + "li");
}
