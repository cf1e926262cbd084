using System.Globalization;
using System.Security.Cryptography;
using System.Text;
using System.Xml.Linq;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// The OME-XML of a result: the source's text with a new sample type where it changes, this file's UUID and name made
/// anew, and one XMLAnnotation with the provenance. Everything else stays as it is, character by character.
/// </summary>
internal static class OmeResult
{
    /// <summary>Makes the text.</summary>
    /// <param name="ome">The source's OME-XML.</param>
    /// <param name="moved">The planes of each TiffData element, by its place, with their pages in the result, ascending; null where every page keeps its number.</param>
    /// <param name="newTypes">New sample types of the images where they change.</param>
    /// <param name="fileName">Name of the result.</param>
    /// <param name="provenance">Provenance.</param>
    /// <param name="ledger">A row per frame.</param>
    public static string Text(OmeXml ome, ILookup<TextSpan, (int Page, OmePlane Plane)>? moved, Dictionary<OmeImage, SampleType> newTypes, string fileName, ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
    {
        List<(TextSpan, string)> edits = [];
        foreach ((OmeImage image, SampleType type) in newTypes)
        {
            if (image.TypeAt is { } typeAt)
                edits.Add((typeAt, TypeName(type)));
            if (image.SignificantBitsAt is { } bitsAt)
                edits.Add((bitsAt, $"{8 * type.Size()}"));
        }

        if (moved is not null)
        {
            if (ome.RootUuidAt is { } rootAt)
                edits.Add((rootAt, Uuid(ome.Uuid, provenance.WorkDigest)));
            edits.AddRange(ome.Images.SelectMany(i => i.TiffData).Select(data => (data.At, TiffData(data.Name, moved[data.At]))));
        }
        else if (ome.UuidsAt.Count > 0)
        {
            string uuid = Uuid(ome.Uuid, provenance.WorkDigest);
            edits.AddRange(ome.UuidsAt.Select(at => (at, uuid)));
            edits.AddRange(ome.FileNamesAt.Select(at => (at, new XAttribute("a", XmlText.Allowed(fileName)).ToString()[3..^1])));
        }

        if (DeclaredEncoding(ome.Xml) is { } encoding)
            edits.Add((encoding, "UTF-8"));
        edits.Add(Annotation(ome, provenance, ledger));
        return ome.Xml.With(edits);
    }

    /// <summary>
    /// Elements for planes whose pages have new numbers, without a file, which means this one: one for each run of planes
    /// that follow each other in DimensionOrder and so do their pages; none where all are lost.
    /// </summary>
    private static string TiffData(string name, IEnumerable<(int Page, OmePlane Plane)> planes)
    {
        StringBuilder text = new();
        (int Page, OmePlane Plane)[] all = [.. planes];
        for (int first = 0, end; first < all.Length; first = end)
        {
            (int page, OmePlane plane) = all[first];
            end = first + 1;
            while (end < all.Length && all[end].Page == page + end - first && OmePlanes.Number(all[end].Plane) == OmePlanes.Number(plane) + end - first)
                end++;
            text.Append(CultureInfo.InvariantCulture, $"<{name} FirstC=\"{plane.C}\" FirstT=\"{plane.T}\" FirstZ=\"{plane.Z}\" IFD=\"{page}\" PlaneCount=\"{end - first}\"/>");
        }

        return text.ToString();
    }

    /// <summary>OME's name of a sample type; it has none for 64-bit integers and 16-bit floats, which keep ours.</summary>
    public static string TypeName(SampleType type) => type switch
    {
        SampleType.Float32 => "float",
        SampleType.Float64 => "double",
        _ => type.Name(),
    };

    /// <summary>A UUID of version 8 (RFC 9562) from the source's UUID and the work: equal work gives equal files.</summary>
    private static string Uuid(string? source, string workDigest)
    {
        byte[] hash = SHA256.HashData(Encoding.UTF8.GetBytes($"{source}\n{workDigest}"));
        hash[6] = (byte)((hash[6] & 0x0F) | 0x80);
        hash[8] = (byte)((hash[8] & 0x3F) | 0x80);
        return "urn:uuid:" + new Guid(hash.AsSpan(0, 16), bigEndian: true);
    }

    private static TextSpan? DeclaredEncoding(XmlText xml)
    {
        int start = xml.Text.IndexOf("<?xml ", StringComparison.Ordinal);
        if (start < 0 || xml.Text.AsSpan(0, start).Trim().Length > 0)
            return null;
        int end = xml.Text.IndexOf("?>", start, StringComparison.Ordinal);
        int at = xml.Text.IndexOf("encoding", start, end - start, StringComparison.Ordinal);
        if (at < 0)
            return null;
        TextSpan value = xml.AttributeValue(at);
        return xml.Text.AsSpan(value.Start, value.Length).Equals("utf-8", StringComparison.OrdinalIgnoreCase) ? null : value;
    }

    /// <summary>
    /// In the 2016-06 schema annotations are in the root's namespace, before that in one of their own; StructuredAnnotations
    /// comes after the images and before the regions of interest.
    /// </summary>
    private static (TextSpan At, string Text) Annotation(OmeXml ome, ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
    {
        XNamespace own = ProvenanceText.Namespace;
        XNamespace annotations = string.CompareOrdinal(ome.Namespace, "http://www.openmicroscopy.org/Schemas/OME/2016-06") >= 0
            ? ome.Namespace
            : ome.Namespace.Replace("/OME/", "/SA/", StringComparison.Ordinal);
        string id = "Annotation:Stacks-" + provenance.WorkDigest[..Math.Min(16, provenance.WorkDigest.Length)];
        for (int i = 2; ome.Xml.Text.Contains($"\"{id}\"", StringComparison.Ordinal); i++)
            id = $"Annotation:Stacks-{i}-{provenance.WorkDigest[..Math.Min(16, provenance.WorkDigest.Length)]}";

        XElement record = new(
            own + "Provenance",
            ProvenanceText.All(provenance, ledger).SelectMany(p => p.Values, (p, value) => new XElement(own + p.Name, XmlText.Allowed(value))));
        XElement annotation = new(
            annotations + "XMLAnnotation",
            new XAttribute("ID", id),
            new XAttribute("Namespace", ProvenanceText.Namespace),
            new XElement(annotations + "Description", XmlText.Allowed($"Made by {provenance.Program} {provenance.Version} from {provenance.SourceName}")),
            new XElement(annotations + "Value", record));

        if (ome.AnnotationsEnd is { } end)
            return (new TextSpan(end, 0), Flat(annotation));
        if (ome.EmptyAnnotations is { } empty)
        {
            // "<StructuredAnnotations/>" becomes a start tag, the annotation and an end tag of the same name.
            int open = ome.Xml.Text.LastIndexOf('<', empty.Start);
            string name = ome.Xml.Text[(open + 1)..empty.Start].Split([' ', '\t', '\r', '\n'], 2)[0];
            return (empty, $">{Flat(annotation)}</{name}>");
        }

        return (new TextSpan(ome.AfterImages, 0), Flat(new XElement(annotations + "StructuredAnnotations", annotation)));
    }

    private static string Flat(XElement element) => element.ToString(SaveOptions.DisableFormatting);
}
