using System.Text;
using System.Xml;
using System.Xml.Linq;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// The XMP packet of a result (ISO 16684-1): an event of xmpMM:History for every step and for the saving, and one
/// structure of the property stacks:Runs with the whole record and ledger. What a source's packet holds is kept.
/// </summary>
internal static class XmpPacket
{
    private static readonly XNamespace X = "adobe:ns:meta/";
    private static readonly XNamespace Rdf = "http://www.w3.org/1999/02/22-rdf-syntax-ns#";
    private static readonly XNamespace Media = "http://ns.adobe.com/xap/1.0/mm/";
    private static readonly XNamespace Event = "http://ns.adobe.com/xap/1.0/sType/ResourceEvent#";
    private static readonly XNamespace Own = ProvenanceText.Namespace;

    /// <summary>Reads a packet.</summary>
    /// <returns>Null when it is not well-formed XML with an rdf:RDF element.</returns>
    public static XDocument? Read(byte[] packet)
    {
        try
        {
            int length = packet.Length;
            while (length > 0 && packet[length - 1] == 0)
                length--;
            using XmlReader reader = XmlReader.Create(new MemoryStream(packet, 0, length), XmlText.Settings);
            XDocument document = XDocument.Load(reader, LoadOptions.PreserveWhitespace);
            return document.Descendants(Rdf + "RDF").Any() ? document : null;
        }
        catch (XmlException)
        {
            return null;
        }
    }

    /// <summary>Makes the packet of a result, in UTF-8.</summary>
    /// <param name="source">The source's packet; null where it has none. One that cannot be read is kept in base64.</param>
    /// <param name="provenance">Provenance.</param>
    /// <param name="ledger">A row per frame.</param>
    public static byte[] Make(byte[]? source, ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
    {
        XDocument document = (source is null ? null : Read(source)) ?? Empty();
        XElement rdf = document.Descendants(Rdf + "RDF").First();
        XAttribute about = rdf.Elements(Rdf + "Description").Attributes(Rdf + "about").FirstOrDefault() ?? new XAttribute(Rdf + "about", "");
        Add(rdf, about, Media + "History", Events(provenance));
        XElement run = Structure(ProvenanceText.All(provenance, ledger)
            .Where(p => !p.IsList || p.Values.Count > 0)
            .Select(p => new XElement(Own + p.Name, p.IsList ? Sequence(p.Values.Select(Item)) : XmlText.Allowed(p.Values[0]))));
        if (source is not null && Read(source) is null)
            run.Add(new XElement(Own + "UnreadablePacket", Convert.ToBase64String(source)));
        Add(rdf, about, Own + "Runs", [run]);
        return Serialise(document);
    }

    private static IEnumerable<XElement> Events(ProvenanceRecord provenance)
    {
        string agent = $"{provenance.Program} {provenance.Version}";
        string when = ProvenanceText.Time(provenance.Created);
        foreach (ProvenanceStep step in provenance.Steps)
        {
            string channel = step.Channel is null ? "" : $" on channel {step.Channel}";
            yield return One("filtered", $"{step.Filter}{channel}: {ProvenanceText.Parameters(step)}", $"{agent}, {step.Plugin} {step.Version}");
        }

        yield return One("saved", $"from {provenance.SourceName}, sha256 {provenance.SourceDigest}", agent);

        XElement One(string action, string parameters, string by) => Structure(
        [
            new(Event + "action", action),
            new(Event + "parameters", XmlText.Allowed(parameters)),
            new(Event + "softwareAgent", XmlText.Allowed(by)),
            new(Event + "when", when),
        ]);
    }

    /// <summary>Appends items to an ordered array, or makes the array in a description of its own.</summary>
    private static void Add(XElement rdf, XAttribute about, XName property, IEnumerable<XElement> items)
    {
        XElement? array = rdf.Elements(Rdf + "Description").Elements(property).Elements(Rdf + "Seq").FirstOrDefault();
        if (array is null)
        {
            array = new XElement(Rdf + "Seq");
            rdf.Add(new XElement(
                Rdf + "Description",
                new XAttribute(about),
                new XAttribute(XNamespace.Xmlns + "xmpMM", Media),
                new XAttribute(XNamespace.Xmlns + "stEvt", Event),
                new XAttribute(XNamespace.Xmlns + "stacks", Own),
                new XElement(property, array)));
        }

        array.Add(items);
    }

    private static XElement Structure(IEnumerable<XElement> fields) =>
        new(Rdf + "li", new XAttribute(Rdf + "parseType", "Resource"), fields);

    private static XElement Sequence(IEnumerable<XElement> items) => new(Rdf + "Seq", items);

    private static XElement Item(string text) => new(Rdf + "li", XmlText.Allowed(text));

    private static XDocument Empty() => new(
        new XProcessingInstruction("xpacket", "begin=\"\uFEFF\" id=\"W5M0MpCehiHzreSzNTczkc9d\""),
        new XElement(
            X + "xmpmeta",
            new XAttribute(XNamespace.Xmlns + "x", X),
            new XElement(Rdf + "RDF", new XAttribute(XNamespace.Xmlns + "rdf", Rdf))),
        new XProcessingInstruction("xpacket", "end=\"w\""));

    private static byte[] Serialise(XDocument document)
    {
        using MemoryStream stream = new();
        XmlWriterSettings settings = new() { Encoding = new UTF8Encoding(false), OmitXmlDeclaration = true, NewLineHandling = NewLineHandling.None };
        using (XmlWriter writer = XmlWriter.Create(stream, settings))
            document.Save(writer);
        return stream.ToArray();
    }
}
