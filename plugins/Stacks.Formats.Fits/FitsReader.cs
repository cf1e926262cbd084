using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Frames of a FITS file: the planes of its science HDUs, in file order.</summary>
internal sealed class FitsReader : IStackReader
{
    private readonly Hdu[] science;

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
    public IReadOnlyList<HeaderFact> Facts { get; }

    /// <summary>The file.</summary>
    public FitsFile File { get; }

    /// <summary>The HDUs, in order.</summary>
    public IReadOnlyList<Hdu> Hdus { get; }

    /// <summary>The header of the primary HDU.</summary>
    public FitsHeader Primary { get; }

    /// <summary>Offset behind the last HDU; other bytes may follow.</summary>
    public long ScannedEnd { get; }

    /// <summary>True when the file ends inside a header.</summary>
    public bool HeaderIsTruncated { get; }

    /// <summary>The header of an HDU, read anew, with the primary's keywords behind it where it says INHERIT = T.</summary>
    public FitsHeader ReadHeader(Hdu hdu)
    {
        if (hdu.Index == 0)
            return Primary;
        FitsHeader header = FitsHeader.Read(File, hdu.HeaderOffset, hdu.Where)
            ?? throw new StackFormatException(hdu.Where, "the header has gone", "check what else writes to the file and run again");
        if (header.OwnTrue("INHERIT") && PrimaryIsEmpty)
            header.Inherited = Primary;
        return header;
    }

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
        File.Read(raw.Resize((int)hdu.PlaneBytes), OffsetOf(hdu, frame - hdu.FirstFrame));
    }

    /// <inheritdoc/>
    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        Hdu hdu = HduOf(frame);
        if (raw.Length != hdu.PlaneBytes)
            throw new StackFormatException(string.Create(CultureInfo.InvariantCulture, $"{hdu.Where}, frame {frame}"), $"{raw.Length} bytes where the header promises {hdu.PlaneBytes}", "get the file again");
        SampleEncoding.Decode(hdu.Layout!.SampleType, raw, stored);
    }

    /// <inheritdoc/>
    public bool MarkQuality(int frame, Plane<SampleFlags> flags)
    {
        Hdu hdu = HduOf(frame);
        foreach (Hdu mask in hdu.Masks)
            QualityMask.Mark(File, mask, mask.Planes == 1 ? 0 : frame - hdu.FirstFrame, flags.Samples);
        return hdu.Masks.Count > 0;
    }

    /// <inheritdoc/>
    public void Dispose() => File.Dispose();

    /// <summary>Offset in the file of a plane.</summary>
    public static long OffsetOf(Hdu hdu, long plane) => hdu.DataOffset + (plane * hdu.PlaneBytes);

    private bool PrimaryIsEmpty => Primary.OwnInteger("NAXIS") == 0;
}
