using System.Collections.Concurrent;
using System.Globalization;
using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;

namespace Stacks.Formats.Fits;

/// <summary>Frames of a FITS file: the planes of its science HDUs, in file order.</summary>
internal sealed class FitsReader : IStackReader
{
    private readonly Hdu[] science;
    private readonly ConcurrentBag<ByteBuffer> buffers = [];

    /// <summary>Opens a file and reads its headers.</summary>
    public FitsReader(IStackFormat format, string path, ReadOptions options)
    {
        Format = format;
        File = new FitsFile(path);
        try
        {
            HduScan scan = HduScan.Walk(File);
            Primary = scan.Primary;
            ScannedEnd = scan.End;
            HeaderIsTruncated = scan.HeaderIsTruncated;
            // Reading a gzipped file to its end is what checks its checksum.
            BytesBehind = File.Present(ScannedEnd, File.IsGzipped ? 1L << 30 : long.MaxValue);
            if (File.Damage is { } damage && !options.AllowTruncated)
                throw new StackFormatException(path, damage, Truncation.Remedy);
            HduRoles.Assign(path, scan.Hdus, options.Extensions);
            Hdus = FrameIndex.Build(this, scan.Hdus, options);
            science = Hdus.Where(h => h.Role == HduRole.Science).ToArray();
            FrameCount = science.Length == 0 ? 0 : science[^1].FirstFrame + (int)science[^1].Planes;
            Parts = PartList.Of(this);
            Facts = HeaderFacts.Of(this);
        }
        catch
        {
            File.Dispose();
            throw;
        }
    }

    /// <inheritdoc/>
    public string Path => File.Path;

    /// <inheritdoc/>
    public IStackFormat Format { get; }

    /// <inheritdoc/>
    public int FrameCount { get; }

    /// <inheritdoc/>
    public IReadOnlyList<StackPart> Parts { get; }

    /// <inheritdoc/>
    public IReadOnlyList<string> Losses => [.. Truncation.Losses(this)];

    /// <inheritdoc/>
    public IReadOnlyList<HeaderFact> Facts { get; }

    /// <summary>The file.</summary>
    public FitsFile File { get; }

    /// <summary>The HDUs, in order.</summary>
    public IReadOnlyList<Hdu> Hdus { get; }

    /// <summary>The header of the primary HDU; that of the image where it is compressed.</summary>
    public FitsHeader Primary { get; }

    /// <summary>Offset behind the last HDU; other bytes may follow.</summary>
    public long ScannedEnd { get; }

    /// <summary>Bytes behind the last HDU; of a gzipped file they are counted up to 1 GiB.</summary>
    public long BytesBehind { get; }

    /// <summary>True when the file ends inside a header.</summary>
    public bool HeaderIsTruncated { get; }

    /// <summary>
    /// The header of an HDU, read anew, with the primary's keywords behind it where it says INHERIT = T; the header of the
    /// image where that is compressed.
    /// </summary>
    public FitsHeader ReadHeader(Hdu hdu)
    {
        if (hdu.Index == 0)
            return Primary;
        FitsHeader header = ReadStoredHeader(hdu);
        if (hdu.Kind == HduKind.CompressedImage)
            header = RestoredHeader.Of(header, asPrimary: false);
        if (header.OwnTrue("INHERIT") && PrimaryIsEmpty)
            header.Inherited = Primary;
        return header;
    }

    /// <summary>The header of an HDU as it stands in the file; that of the table where an image is compressed.</summary>
    public FitsHeader ReadStoredHeader(Hdu hdu) => FitsHeader.Read(File, hdu.HeaderOffset, hdu.Where)
        ?? throw new StackFormatException(hdu.Where, "the header has gone", "check what else writes to the file and run again");

    /// <summary>The science HDU of a frame.</summary>
    public Hdu HduOf(int frame)
    {
        ArgumentOutOfRangeException.ThrowIfNegative(frame);
        ArgumentOutOfRangeException.ThrowIfGreaterThanOrEqual(frame, FrameCount);
        int low = 0, high = science.Length - 1;
        while (low < high)
        {
            int middle = (low + high + 1) / 2;
            if (science[middle].FirstFrame <= frame)
                low = middle;
            else
                high = middle - 1;
        }

        return science[low];
    }

    /// <inheritdoc/>
    public FrameLayout Layout(int frame) => HduOf(frame).Layout!;

    /// <inheritdoc/>
    public HeaderNoise NoiseOf(int frame) => CameraKeywords.NoiseOf(this, frame);

    /// <inheritdoc/>
    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation) => HealthCheck.Of(this, cancellation);

    /// <inheritdoc/>
    public void Read(int frame, ByteBuffer raw)
    {
        Hdu hdu = HduOf(frame);
        ReadPlane(hdu, frame - hdu.FirstFrame, raw);
    }

    /// <inheritdoc/>
    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        Hdu hdu = HduOf(frame);
        DecodePlane(hdu, frame - hdu.FirstFrame, raw, stored);
    }

    /// <inheritdoc/>
    public bool DecodesInPlace(int frame) => HduOf(frame).Tiles is null;

    /// <summary>Reads and decodes a plane of a science HDU or of a quality mask.</summary>
    /// <param name="hdu">The HDU.</param>
    /// <param name="plane">The plane, from 0.</param>
    /// <param name="stored">Receives the plane's stored samples.</param>
    public void ReadStored(Hdu hdu, long plane, Span<byte> stored)
    {
        ByteBuffer raw = buffers.TryTake(out ByteBuffer? used) ? used : new ByteBuffer();
        ReadPlane(hdu, plane, raw);
        DecodePlane(hdu, plane, raw.Written, stored);
        buffers.Add(raw);
    }

    private void ReadPlane(Hdu hdu, long plane, ByteBuffer raw)
    {
        if (hdu.Tiles is not null)
            TileRows.Read(File, hdu, plane, raw);
        else
            File.Read(raw.Resize((int)hdu.PlaneBytes), OffsetOf(hdu, plane));
    }

    private static void DecodePlane(Hdu hdu, long plane, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        if (hdu.Tiles is not null)
        {
            TileDecoder.Decode(hdu, plane, raw, stored);
            return;
        }

        if (raw.Length != stored.Length)
            throw new StackFormatException(string.Create(CultureInfo.InvariantCulture, $"{hdu.Where}, plane {plane}"), $"{raw.Length} bytes where the header promises {stored.Length}", "get the file again");
        SampleEncoding.Decode(hdu.Layout!.SampleType, raw, stored);
    }

    /// <inheritdoc/>
    public bool MarkQuality(int frame, Plane<SampleFlags> flags)
    {
        Hdu hdu = HduOf(frame);
        foreach (Hdu mask in hdu.Masks)
            QualityMask.Mark(this, mask, mask.Planes == 1 ? 0 : frame - hdu.FirstFrame, flags.Samples);
        return hdu.Masks.Count > 0;
    }

    /// <inheritdoc/>
    public void Dispose() => File.Dispose();

    /// <summary>Offset in the file of a plane.</summary>
    public static long OffsetOf(Hdu hdu, long plane) => hdu.DataOffset + (plane * hdu.PlaneBytes);

    private bool PrimaryIsEmpty => Primary.OwnInteger("NAXIS") == 0;
}
