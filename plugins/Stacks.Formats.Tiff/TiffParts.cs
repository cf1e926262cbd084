using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>The parts of a file, for <c>inspect</c>: runs of pages that are alike, and what a result does not carry.</summary>
internal static class TiffParts
{
    /// <summary>All parts.</summary>
    public static IReadOnlyList<StackPart> Of(TiffReader reader)
    {
        List<StackPart> parts = [];
        IReadOnlyList<Page> pages = reader.Index.Pages;
        for (int first = 0; first < pages.Count;)
        {
            PageLayout layout = pages[first].Layout;
            int end = first + 1;
            while (end < pages.Count && ReferenceEquals(pages[end].Layout, layout))
                end++;
            string name = end == first + 1 ? $"page {first}" : $"pages {first} to {end - 1}";
            parts.Add(layout.Frame is null
                ? ReferenceEquals(layout, PageLayout.Lost)
                ? new StackPart(name, layout.Shape, "lost", "not carried")
                : new StackPart(name, layout.Shape, "thumbnail", layout.Carried ? "carried" : "not carried")
                : new StackPart(name, $"{layout.Shape}, {layout.Coding}", "science", "filtered"));
            first = end;
        }

        if (reader.Metadata.Ome is { } ome)
        {
            parts.Add(new StackPart("OME-XML", $"{ome.Xml.Text.Length} characters", "metadata", "carried"));
            parts.AddRange(OtherFiles(ome).Select(f => new StackPart(f, "planes of the same OME set", "other file", "not carried")));
        }

        parts.AddRange(reader.Index.TagsNotCarried.Select(t => new StackPart($"tag {t}", NameOf(t), "metadata", "not carried")));
        return parts;
    }

    /// <summary>Files of the same OME set that are named, but are not this one.</summary>
    public static IEnumerable<string> OtherFiles(OmeXml ome)
    {
        IEnumerable<string> planes = ome.Images.SelectMany(i => i.TiffData).Select(d => d.OtherFile).OfType<string>();
        return (ome.MetadataFile is { } companion ? planes.Prepend(companion) : planes).Distinct();
    }

    private static string NameOf(ushort tag) => tag switch
    {
        Tag.SubIfds => "reduced copies below the page (SubIFDs)",
        Tag.ExifDirectory => "EXIF directory",
        Tag.GpsDirectory => "GPS directory",
        Tag.InteroperabilityDirectory => "interoperability directory",
        _ => "a field of unknown type",
    };
}
