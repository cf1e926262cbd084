using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>Checks a file's integrity. TIFF has no checksums of its own; Deflate data have.</summary>
internal static class TiffHealth
{
    private const int Named = 5;

    /// <summary>All findings; compressed pages are decoded.</summary>
    public static IEnumerable<HealthFinding> Check(TiffReader reader, CancellationToken cancellation)
    {
        PageIndex index = reader.Index;
        foreach (string loss in index.Losses)
            yield return new HealthFinding(true, $"the file is truncated: {loss}");
        if (index.Losses.Count == 0)
            yield return new HealthFinding(false, string.Create(CultureInfo.InvariantCulture, $"all {index.Pages.Count} pages and their image data lie inside the file"));

        TiffMetadata metadata = reader.Metadata;
        if (metadata.OmeProblem is { } problem)
            yield return new HealthFinding(true, problem);
        if (metadata.Ome is not null)
        {
            foreach (HealthFinding finding in CheckOme(reader))
                yield return finding;
        }

        if (metadata.Xmp is { } packet && XmpPacket.Read(packet) is null)
            yield return new HealthFinding(true, "the XMP packet of page 0 is not well-formed: a result carries it in base64 inside its own packet");

        foreach (HealthFinding finding in CheckPages(reader, cancellation))
            yield return finding;
    }

    /// <summary>Decodes every compressed page.</summary>
    public static IEnumerable<HealthFinding> CheckPages(TiffReader reader, CancellationToken cancellation)
    {
        ByteBuffer raw = new();
        ByteBuffer stored = new();
        int compressed = 0;
        int damaged = 0;
        for (int f = 0; f < reader.FrameCount; f++)
        {
            cancellation.ThrowIfCancellationRequested();
            if (!reader.IsCompressed(f))
                continue;
            compressed++;
            if (Damage(reader, f, raw, stored) is { } damage && ++damaged <= Named)
                yield return new HealthFinding(true, damage);
        }

        if (damaged > Named)
            yield return new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"{damaged - Named} more pages cannot be decoded"));
        if (compressed > 0 && damaged == 0)
            yield return new HealthFinding(false, string.Create(CultureInfo.InvariantCulture, $"all {compressed} compressed pages decode"));
    }

    private static IEnumerable<HealthFinding> CheckOme(TiffReader reader)
    {
        if (reader.Metadata.Ome!.MetadataFile is { } companion)
            yield return new HealthFinding(true, $"the OME-XML stands in {companion}, which is not beside the file: pages are taken without channel, z and time");
        if (reader.Metadata.Planes is not { } planes)
            yield break;
        int strangers = planes.Where((place, page) => place is null && reader.Index.Pages[page].Layout.Frame is not null).Count();
        if (strangers > 0)
            yield return new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"{strangers} pages have no place in the OME-XML: they are taken without channel, z and time"));
        for (int f = 0; f < reader.FrameCount; f++)
        {
            if (planes[reader.PageNumber(f)] is { } plane && plane.Image.Type != OmeResult.TypeName(reader.Layout(f).SampleType))
            {
                yield return new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"page {reader.PageNumber(f)} holds {reader.Layout(f).SampleType.Name()} samples, the OME-XML says {plane.Image.Type}: the page's own word is taken"));
                yield break;
            }
        }
    }

    private static string? Damage(TiffReader reader, int frame, ByteBuffer raw, ByteBuffer stored)
    {
        try
        {
            reader.Read(frame, raw);
            reader.Decode(frame, raw.Written, stored.Resize((int)reader.Layout(frame).StoredBytes));
            return null;
        }
        catch (StackFormatException error)
        {
            return error.Message;
        }
    }
}
