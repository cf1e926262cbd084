using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>A plane of a set.</summary>
/// <param name="File">Number of the file it stands in.</param>
/// <param name="Page">Its page there.</param>
/// <param name="Plane">Its place in its image.</param>
/// <param name="Data">The element that names it.</param>
internal readonly record struct OmeSetPlane(int File, int Page, OmePlane Plane, OmeTiffData Data);

/// <summary>
/// The planes of an OME-TIFF set that is spread over several files (OME-TIFF specification, "Distributing datasets across
/// multiple files"), found by the TiffData elements of one text: image after image, and in each by DimensionOrder. Every
/// file is opened once to see that it is there, is the one that is meant, and has the pages.
/// </summary>
internal sealed class OmeSet
{
    private const long LongestText = 64L << 20;
    private readonly TiffFormat format;
    private readonly ReadOptions options;
    private readonly List<string> paths = [];
    private readonly Dictionary<string, SetFile> opened = [];
    private long allPages;
    private readonly List<string> losses = [];
    private readonly List<OmeSetPlane> planes = [];

    private OmeSet(TiffFormat format, string path, OmeXml ome, ReadOptions options)
    {
        this.format = format;
        this.options = options;
        Path = path;
        Ome = ome;
    }

    /// <summary>The file that was named.</summary>
    public string Path { get; }

    /// <summary>The text that describes the set.</summary>
    public OmeXml Ome { get; }

    /// <summary>The files with planes, in the order in which the text names them.</summary>
    public IReadOnlyList<string> Paths => paths;

    /// <summary>A companion file that is none of <see cref="Paths"/>; null where the text stands in a TIFF file.</summary>
    public string? Companion { get; private init; }

    /// <summary>The planes, in order.</summary>
    public IReadOnlyList<OmeSetPlane> Planes => planes;

    /// <summary>Files with pages to which the text gives no place, and how many; a result does not carry these.</summary>
    public IReadOnlyList<(string File, int Pages)> Unplaced { get; private set; } = [];

    /// <summary>What is missing, where that is allowed.</summary>
    public IReadOnlyList<string> Losses => losses;

    /// <summary>True when all files have big-endian byte order, false when none has.</summary>
    public bool BigEndian { get; private set; }

    /// <summary>True when a file is BigTIFF.</summary>
    public bool IsBig { get; private set; }

    /// <summary>Bytes of the files that are not image data.</summary>
    public long OtherBytes { get; private set; }

    /// <summary>The set of a TIFF file whose OME-XML names other files; null for a file that stands alone.</summary>
    public static OmeSet? Of(TiffReader reader, ReadOptions options)
    {
        if (reader.Metadata.Ome is not { } ome)
            return null;
        if (ome.MetadataFile is { } companion && options.AllowTruncated && !File.Exists(Beside(reader.Path, companion)))
            return null;
        if (ome.MetadataFile is { } there)
            return OfCompanion((TiffFormat)reader.Format, reader.Path, Beside(reader.Path, there), ome.MetadataUuid, options);
        return TiffParts.OtherFiles(ome).Any() ? new OmeSet((TiffFormat)reader.Format, reader.Path, ome, options).Find() : null;
    }

    /// <summary>The set that a companion file describes.</summary>
    /// <param name="format">The format.</param>
    /// <param name="path">The file that was named: the companion, or a TIFF file that points to it.</param>
    /// <param name="companion">The companion.</param>
    /// <param name="uuid">Its UUID as the TIFF file has it; null where nobody says.</param>
    /// <param name="options">How files are opened.</param>
    public static OmeSet OfCompanion(TiffFormat format, string path, string companion, string? uuid, ReadOptions options)
    {
        if (!File.Exists(companion))
            throw new StackFormatException(path, $"its metadata stand in {System.IO.Path.GetFileName(companion)}, which is not beside it", "copy all files of the set into one folder, or take its pages without their places with --salvage");
        byte[] bytes;
        try
        {
            if (new FileInfo(companion).Length > LongestText)
                throw new StackFormatException(companion, "the OME-XML is longer than 64 MiB", "check that this is the file you mean");
            bytes = File.ReadAllBytes(companion);
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            throw new StackIOException(companion, $"cannot be read ({e.Message})", "check that it is a file and may be read", e);
        }

        OmeXml ome = OmeXml.Read(XmlText.Decode(bytes), "", out string? problem)
            ?? throw new StackFormatException($"{companion}, byte 0", problem ?? "this is not OME-XML", "get the file again");
        if (ome.MetadataFile is not null)
            throw new StackFormatException(companion, "the file says itself that its metadata stand in another", "get the file again");
        if (uuid is not null && ome.Uuid is not null && uuid != ome.Uuid)
            throw new StackFormatException(companion, $"it is {ome.Uuid}, {System.IO.Path.GetFileName(path)} wants {uuid} of this name", "copy the files of the set again from one source");
        return new OmeSet(format, path, ome, options) { Companion = companion }.Find();
    }

    private sealed record SetFile(int Number, bool[] IsFrame, string? Uuid);

    private OmeSet Find()
    {
        List<(int Image, OmeSetPlane Plane)> found = [];
        HashSet<(int, Int128)> seen = [];
        long named = 0;
        for (int i = 0; i < Ome.Images.Count; i++)
        {
            OmeImage image = Ome.Images[i];
            foreach (IGrouping<string?, OmeTiffData> ofFile in image.TiffData.GroupBy(d => d.OtherFile))
            {
                string path = ofFile.Key is { } name ? Beside(Path, name) : Companion is null ? Path : throw NoFile(image);
                if (Open(path, ofFile) is not { } file)
                    continue;
                int pages = file.IsFrame.Length;
                foreach (OmeTiffData data in ofFile)
                {
                    (int Page, OmePlane Plane)[] covered = [.. OmePlanes.Of(image, data, pages)];
                    if (data.Planes is { } promised && covered.Length < promised && (Int128)covered.Length + data.Ifd >= pages)
                        Lose($"{System.IO.Path.GetFileName(path)} has {pages} pages, the set wants {promised} of them from page {data.Ifd} on");
                    named += covered.Length;
                    if (named > OmePlanes.MostPerPage * allPages)
                        throw new StackFormatException(Path, "the OME-XML names pages of its files again and again", "get the file again");
                    foreach ((int page, OmePlane plane) in covered)
                    {
                        if (!file.IsFrame[page])
                            Lose(string.Create(CultureInfo.InvariantCulture, $"page {page} of {System.IO.Path.GetFileName(path)}, which the OME set wants, is a thumbnail or is lost"));
                        else if (seen.Add((i, OmePlanes.Number(plane))))
                            found.Add((i, new OmeSetPlane(file.Number, page, plane, data)));
                    }
                }
            }
        }

        planes.AddRange(found.OrderBy(f => f.Image).ThenBy(f => OmePlanes.Number(f.Plane.Plane)).Select(f => f.Plane));
        Unplaced =
        [
            .. opened.Select(f => (System.IO.Path.GetFileName(f.Key), f.Value.IsFrame.Count(frame => frame) - planes.Where(p => p.File == f.Value.Number).Select(p => p.Page).Distinct().Count()))
                .Where(f => f.Item2 > 0),
        ];
        return planes.Count > 0 ? this : throw new StackFormatException(Path, "the OME-XML names no plane that is there", "copy all files of the set into one folder");
    }

    /// <summary>A file of the set, opened the first time it is asked for; null where it is missing and may be.</summary>
    private SetFile? Open(string path, IEnumerable<OmeTiffData> wanted)
    {
        if (!opened.TryGetValue(path, out SetFile? file))
        {
            if (!File.Exists(path))
            {
                long count = wanted.Sum(d => (long)(d.Planes ?? 1));
                Lose(string.Create(CultureInfo.InvariantCulture, $"the file {System.IO.Path.GetFileName(path)} of the OME set is missing, and with it {count} planes"));
                return null;
            }

            file = Look(path);
            opened.Add(path, file);
        }

        if (wanted.FirstOrDefault(d => d.OtherUuid is not null) is { OtherUuid: { } link } && file.Uuid is not null && file.Uuid != link)
            throw new StackFormatException(path, $"it is {file.Uuid}, the OME set wants {link} of this name", "copy the files of the set again from one source");
        return file;
    }

    private SetFile Look(string path)
    {
        using TiffReader reader = TiffReader.OpenAlone(format, path, options);
        losses.AddRange(reader.Losses.Select(loss => $"{System.IO.Path.GetFileName(path)}: {loss}"));
        if (reader.FrameCount != reader.Index.Pages.Count(p => p.Layout.Frame is not null))
            throw new StackFormatException(path, "a file of an OME set with several samples a pixel", "put the set into one file first");
        if (paths.Count > 0 && BigEndian != reader.File.BigEndian)
            throw new StackFormatException(path, "its byte order is another than that of the set's first file", "write the files of the set in one byte order");
        paths.Add(path);
        BigEndian = reader.File.BigEndian;
        IsBig |= reader.File.IsBig;
        OtherBytes += reader.File.Length - Math.Min(reader.File.Length, reader.Index.ImageBytes);
        bool[] isFrame = [.. reader.Index.Pages.Select(p => p.Layout.Frame is not null)];
        allPages += isFrame.Length;
        return new SetFile(paths.Count - 1, isFrame, reader.Metadata.Ome?.Uuid);
    }

    private void Lose(string what)
    {
        if (!options.AllowTruncated)
            throw new StackFormatException(Path, what, "copy all files of the set into one folder, or take what is there with --salvage");
        losses.Add(what);
    }

    private StackFormatException NoFile(OmeImage image) =>
        new(Companion!, $"a TiffData element of image '{image.Name}' names no file", "get the file again");

    /// <summary>A path beside another; a name from a file must not lead elsewhere.</summary>
    private static string Beside(string path, string name)
    {
        if (name.Length == 0 || name is "." or ".." || name.AsSpan().ContainsAny('/', '\\', '\0') || name.StartsWith("urn:", StringComparison.Ordinal))
            throw new StackFormatException(path, $"the OME set names the file '{name}', which is no plain file name", "put all files of the set into one folder and name them there");
        return System.IO.Path.Combine(System.IO.Path.GetDirectoryName(path) ?? "", name);
    }
}
