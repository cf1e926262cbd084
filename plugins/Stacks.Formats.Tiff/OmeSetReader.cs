using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>Reads an OME-TIFF set of several files as one stack; a few files are open at a time.</summary>
internal sealed class OmeSetReader : IStackReader
{
    private const int MostOpen = 64; // channels in files of their own come in turn
    private readonly ReaderPool readers;

    /// <summary>A reader of a set.</summary>
    public OmeSetReader(TiffFormat format, OmeSet set, ReadOptions options)
    {
        Format = format;
        Set = set;
        readers = new ReaderPool(file => TiffReader.OpenAlone(format, set.Paths[file], options), MostOpen);
    }

    /// <summary>The set.</summary>
    public OmeSet Set { get; }

    /// <inheritdoc/>
    public string Path => Set.Path;

    /// <inheritdoc/>
    public IStackFormat Format { get; }

    /// <inheritdoc/>
    public IReadOnlyList<string> OtherFiles => [.. Set.Paths.Append(Set.Companion).OfType<string>().Where(p => p != Path)];

    /// <inheritdoc/>
    public IReadOnlyList<string> Losses => Set.Losses;

    /// <inheritdoc/>
    public int FrameCount => Set.Planes.Count;

    /// <inheritdoc/>
    public IReadOnlyList<StackPart> Parts =>
    [
        .. Set.Planes.GroupBy(p => p.File).Select(g => new StackPart(
            System.IO.Path.GetFileName(Set.Paths[g.Key]), string.Create(CultureInfo.InvariantCulture, $"{g.Count()} planes of the set"), "science", "filtered")),
        .. Set.Unplaced.Select(f => new StackPart(f.File, $"{f.Pages} pages without a place in the set", "other pages", "not carried")),
        new StackPart("OME-XML", $"{Set.Ome.Xml.Text.Length} characters", "metadata", "carried"),
    ];

    /// <inheritdoc/>
    public IReadOnlyList<HeaderFact> Facts =>
        [new("container", string.Create(CultureInfo.InvariantCulture, $"OME-TIFF set of {Set.Paths.Count} files{(Set.Companion is { } companion ? " and " + System.IO.Path.GetFileName(companion) : "")}")), .. Set.Ome.Facts()];

    /// <inheritdoc/>
    public FrameLayout Layout(int frame)
    {
        using ReaderPool.Lease file = readers.Lend(Set.Planes[frame].File);
        TiffReader reader = (TiffReader)file.Reader;
        return OmePlanes.Place(reader.OwnLayout(reader.FrameOfPage(Set.Planes[frame].Page)), Set.Planes[frame].Plane, 0, Set.Ome.Images.Count > 1);
    }

    /// <inheritdoc/>
    public HeaderNoise NoiseOf(int frame) => TiffReader.NoNoise;

    /// <inheritdoc/>
    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation)
    {
        foreach (string loss in Losses)
            yield return new HealthFinding(true, loss);
        for (int i = 0; i < Set.Paths.Count; i++)
        {
            using ReaderPool.Lease file = readers.Lend(i);
            foreach (HealthFinding finding in TiffHealth.CheckPages((TiffReader)file.Reader, cancellation))
                yield return finding with { Text = $"{System.IO.Path.GetFileName(Set.Paths[i])}: {finding.Text}" };
        }
    }

    /// <inheritdoc/>
    public void Read(int frame, ByteBuffer raw)
    {
        using ReaderPool.Lease file = readers.Lend(Set.Planes[frame].File);
        file.Reader.Read(((TiffReader)file.Reader).FrameOfPage(Set.Planes[frame].Page), raw);
    }

    /// <inheritdoc/>
    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        using ReaderPool.Lease file = readers.Lend(Set.Planes[frame].File);
        file.Reader.Decode(((TiffReader)file.Reader).FrameOfPage(Set.Planes[frame].Page), raw, stored);
    }

    /// <inheritdoc/>
    public long RawBytes(int frame)
    {
        using ReaderPool.Lease file = readers.Lend(Set.Planes[frame].File);
        return file.Reader.RawBytes(((TiffReader)file.Reader).FrameOfPage(Set.Planes[frame].Page));
    }

    /// <inheritdoc/>
    public bool MarkQuality(int frame, Plane<SampleFlags> flags) => false;

    /// <inheritdoc/>
    public void Dispose() => readers.Dispose();

    /// <summary>The fields of a frame's page that its result carries.</summary>
    public IReadOnlyList<OutputField> CarriedFieldsOf(int frame, bool typeChanged, bool samplesChanged)
    {
        using ReaderPool.Lease file = readers.Lend(Set.Planes[frame].File);
        TiffReader reader = (TiffReader)file.Reader;
        TiffDirectory directory = TiffDirectory.Read(reader.File, new FileWindow(reader.File), reader.Index.Pages[Set.Planes[frame].Page].Directory, reader.Path);
        return [.. CarriedFields.OfScience(reader.File, directory, typeChanged, samplesChanged)];
    }
}
