using System.Globalization;
using System.Xml;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// The OME-XML of the first page (schema 2016-06; earlier ones differ in names that are accepted here too), read in one
/// pass, with the places of everything a result must write anew.
/// </summary>
internal sealed class OmeXml
{
    /// <summary>Levels of elements that are of interest: OME/Image/Pixels/TiffData/UUID.</summary>
    private const int Deepest = 5;

    private readonly XmlText xml;
    private readonly string fileName;
    private string? pendingUuidFile;
    private TextSpan? pendingUuidFileAt;

    private OmeXml(string text, string fileName)
    {
        xml = new XmlText(text);
        this.fileName = fileName;
    }

    /// <summary>The text with its places.</summary>
    public XmlText Xml => xml;

    /// <summary>Namespace of the root.</summary>
    public string Namespace { get; private set; } = "";

    /// <summary>UUID of this file; null where it has none.</summary>
    public string? Uuid { get; private set; }

    /// <summary>Where the UUID stands in the root; null where it has none.</summary>
    public TextSpan? RootUuidAt { get; private set; }

    /// <summary>Where this file's UUID stands.</summary>
    public List<TextSpan> UuidsAt { get; } = [];

    /// <summary>Where this file's name stands beside its UUID.</summary>
    public List<TextSpan> FileNamesAt { get; } = [];

    /// <summary>The images.</summary>
    public List<OmeImage> Images { get; } = [];

    /// <summary>The file that holds the metadata of a binary-only file; null for an ordinary one.</summary>
    public string? MetadataFile { get; private set; }

    /// <summary>UUID of that file; null where it is not given.</summary>
    public string? MetadataUuid { get; private set; }

    /// <summary>Where an annotation goes: before the end tag of StructuredAnnotations; null where there is none.</summary>
    public int? AnnotationsEnd { get; private set; }

    /// <summary>The <c>/&gt;</c> of an empty StructuredAnnotations element; null where there is none.</summary>
    public TextSpan? EmptyAnnotations { get; private set; }

    /// <summary>Where a StructuredAnnotations element may go: after the last Image, before any ROI.</summary>
    public int AfterImages { get; private set; }

    /// <summary>Reads OME-XML.</summary>
    /// <param name="text">The first page's description.</param>
    /// <param name="fileName">Name of the file, to know its own planes where it has no UUID.</param>
    /// <param name="problem">Why a text that looks like OME-XML cannot be read; null otherwise.</param>
    /// <returns>Null when the text is not OME-XML or cannot be read.</returns>
    public static OmeXml? Read(string text, string fileName, out string? problem)
    {
        problem = null;
        if (!text.AsSpan().TrimStart().StartsWith("<", StringComparison.Ordinal) || !text.Contains("OME", StringComparison.Ordinal))
            return null;
        OmeXml ome = new(text, fileName);
        try
        {
            return ome.Scan() ? ome : null;
        }
        catch (XmlException error)
        {
            problem = "the OME-XML of the first page cannot be read, its pages are taken without channel, z and time: " + error.Message;
            return null;
        }
    }

    /// <summary>Header facts for people, in a fixed order.</summary>
    public IEnumerable<HeaderFact> Facts()
    {
        foreach (OmeImage image in Images)
        {
            yield return new("OME image", string.Create(CultureInfo.InvariantCulture, $"{image.Name}: {image.Size.C} channels, {image.Size.Z} along z, {image.Size.T} times"));
            if (image.AcquisitionDate is { } date)
                yield return new("taken", date);
            foreach ((string label, string value) in image.Scales)
                yield return new(label, value);
            if (image.SignificantBits is { } bits)
                yield return new("significant bits", string.Create(CultureInfo.InvariantCulture, $"{bits}"));
            for (int c = 0; c < image.ChannelNames.Count; c++)
                yield return new(string.Create(CultureInfo.InvariantCulture, $"channel {c}"), image.ChannelNames[c] ?? "without a name");
        }
    }

    private bool Scan()
    {
        using XmlReader reader = XmlReader.Create(new StringReader(xml.Text), XmlText.Settings);
        IXmlLineInfo lines = (IXmlLineInfo)reader;
        List<string> path = [];
        while (reader.Read())
        {
            switch (reader.NodeType)
            {
                case XmlNodeType.Element:
                    int tagAt = xml.At(lines);
                    path.RemoveRange(reader.Depth, path.Count - reader.Depth);
                    path.Add(reader.LocalName);
                    if (path[0] != "OME")
                        return false;
                    if (reader.Depth < Deepest)
                        StartElement(reader, string.Join('/', path), tagAt, reader.IsEmptyElement);
                    break;
                case XmlNodeType.EndElement when reader.Depth <= 1:
                    EndElement(reader, xml.At(lines));
                    break;
                case XmlNodeType.EndElement when reader.Depth == 3 && path is ["OME", "Image", "Pixels", "TiffData", ..]:
                    EndTiffData(xml.AfterTag(xml.At(lines)));
                    break;
                case XmlNodeType.Text when reader.Depth <= Deepest:
                    TextNode(reader, string.Join('/', path.Take(reader.Depth)), xml.At(lines));
                    break;
            }
        }

        return true;
    }

    private void StartElement(XmlReader reader, string path, int tagAt, bool empty)
    {
        switch (path)
        {
            case "OME":
                Namespace = reader.NamespaceURI;
                Uuid = reader.GetAttribute("UUID")?.Trim();
                RootUuidAt = Place(reader, "UUID");
                if (RootUuidAt is { } uuidAt)
                    UuidsAt.Add(uuidAt);
                break;
            case "OME/BinaryOnly":
                MetadataFile = reader.GetAttribute("MetadataFile") ?? "of unknown name";
                MetadataUuid = reader.GetAttribute("UUID")?.Trim();
                break;
            case "OME/Image":
                Images.Add(new OmeImage { Name = reader.GetAttribute("Name") ?? reader.GetAttribute("ID") ?? "" });
                if (empty)
                    AfterImages = xml.AfterTag(tagAt);
                break;
            case "OME/StructuredAnnotations" when empty:
                int after = xml.AfterTag(tagAt);
                EmptyAnnotations = new TextSpan(after - 2, 2);
                break;
            case "OME/Image/Pixels":
                ReadPixels(reader, Images[^1]);
                break;
            case "OME/Image/Pixels/Channel":
                Images[^1].ChannelNames.Add(reader.GetAttribute("Name"));
                break;
            case "OME/Image/Pixels/TiffData":
                int? planes = Whole(reader, "PlaneCount") ?? Whole(reader, "NumPlanes") ?? (reader.GetAttribute("IFD") is null ? null : 1);
                Images[^1].TiffData.Add(new OmeTiffData(
                    Whole(reader, "IFD") ?? 0, planes, Whole(reader, "FirstC") ?? 0, Whole(reader, "FirstZ") ?? 0, Whole(reader, "FirstT") ?? 0, null)
                {
                    At = new TextSpan(tagAt - 1, xml.AfterTag(tagAt) - tagAt + 1),
                    Name = reader.Name,
                });
                break;
            case "OME/Image/Pixels/TiffData/UUID":
                pendingUuidFile = reader.GetAttribute("FileName");
                pendingUuidFileAt = Place(reader, "FileName");
                break;
        }
    }

    private void EndElement(XmlReader reader, int nameAt)
    {
        if (reader.Depth == 0 && AfterImages == 0)
            AfterImages = nameAt - 2;
        if (reader.Depth == 1 && reader.LocalName == "Image")
            AfterImages = xml.AfterTag(nameAt);
        if (reader.Depth == 1 && reader.LocalName == "StructuredAnnotations")
            AnnotationsEnd = nameAt - 2;
    }

    private void EndTiffData(int end)
    {
        List<OmeTiffData> data = Images[^1].TiffData;
        data[^1] = data[^1] with { At = data[^1].At with { Length = end - data[^1].At.Start } };
    }

    private void TextNode(XmlReader reader, string path, int at)
    {
        if (path is "OME/Image/AcquisitionDate" or "OME/Image/AcquiredDate")
            Images[^1].AcquisitionDate = reader.Value.Trim();
        if (path != "OME/Image/Pixels/TiffData/UUID")
            return;

        string uuid = reader.Value.Trim();
        bool own = Uuid is null ? string.Equals(pendingUuidFile, fileName, StringComparison.OrdinalIgnoreCase) : uuid == Uuid;
        if (own)
        {
            int found = xml.Text.IndexOf(uuid, at, StringComparison.Ordinal);
            if (found >= 0)
                UuidsAt.Add(new TextSpan(found, uuid.Length));
            if (pendingUuidFileAt is { } place)
                FileNamesAt.Add(place);
        }
        else
        {
            List<OmeTiffData> data = Images[^1].TiffData;
            data[^1] = data[^1] with { OtherFile = pendingUuidFile ?? uuid, OtherUuid = uuid };
        }
    }

    private void ReadPixels(XmlReader reader, OmeImage image)
    {
        string order = reader.GetAttribute("DimensionOrder") ?? "XYZCT";
        if (order.Length == 5 && order.StartsWith("XY", StringComparison.Ordinal) && order.Order().SequenceEqual("CTXYZ"))
            image.DimensionOrder = order;
        image.Size = (Math.Max(1, Whole(reader, "SizeC") ?? 1), Math.Max(1, Whole(reader, "SizeZ") ?? 1), Math.Max(1, Whole(reader, "SizeT") ?? 1));
        string typeName = reader.GetAttribute("Type") is null ? "PixelType" : "Type";
        image.Type = reader.GetAttribute(typeName) ?? "";
        image.TypeAt = Place(reader, typeName);
        image.SignificantBits = Whole(reader, "SignificantBits");
        image.SignificantBitsAt = Place(reader, "SignificantBits");
        foreach ((string name, string label, string unit) in new[]
        {
            ("PhysicalSizeX", "pixel width", "µm"), ("PhysicalSizeY", "pixel height", "µm"), ("PhysicalSizeZ", "z step", "µm"), ("TimeIncrement", "time step", "s"),
        })
        {
            if (reader.GetAttribute(name) is { } value)
                image.Scales.Add((label, $"{value} {reader.GetAttribute(name + "Unit") ?? unit}"));
        }
    }

    private TextSpan? Place(XmlReader reader, string attribute)
    {
        if (!reader.MoveToAttribute(attribute))
            return null;
        TextSpan place = xml.AttributeValue(xml.At((IXmlLineInfo)reader));
        reader.MoveToElement();
        return place;
    }

    private static int? Whole(XmlReader reader, string attribute) =>
        int.TryParse(reader.GetAttribute(attribute), NumberStyles.None, CultureInfo.InvariantCulture, out int number) ? number : null;
}
