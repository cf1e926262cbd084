using System.Globalization;
using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;

namespace Stacks.Formats.Fits;

/// <summary>
/// Walks a file from HDU to HDU, checks every size against the file's length, and reads no samples. An image that was the
/// primary array and was compressed is the primary HDU again, in the place of the one without data that compression put
/// before it.
/// </summary>
internal sealed class HduScan
{
    private const string GetAgain = "get the file again";
    private const int MostAxes = 999;

    private HduScan()
    {
    }

    /// <summary>The HDUs in order. The last one may be truncated; a file is refused for that elsewhere.</summary>
    public List<Hdu> Hdus { get; } = [];

    /// <summary>The header of the primary HDU: that of the image where it is compressed.</summary>
    public FitsHeader Primary { get; private set; } = null!;

    /// <summary>Offset behind the last HDU that is there; more bytes may follow.</summary>
    public long End { get; private set; }

    /// <summary>True when the file ends inside the header that starts at <see cref="End"/>.</summary>
    public bool HeaderIsTruncated { get; private set; }

    /// <summary>Walks a file.</summary>
    /// <exception cref="StackFormatException">Not FITS, or a header is broken or hostile.</exception>
    public static HduScan Walk(FitsFile file)
    {
        HduScan scan = new();
        Span<byte> start = stackalloc byte[9];
        for (int number = 0; file.Present(scan.End, start.Length) == start.Length; number++)
        {
            int index = scan.Hdus.Count;
            file.Read(start, scan.End);
            if (!start.SequenceEqual(index == 0 ? "SIMPLE  ="u8 : "XTENSION="u8))
                break;
            string where = string.Create(CultureInfo.InvariantCulture, $"{file.Path}, HDU {number} at byte {scan.End}");
            if (FitsHeader.Read(file, scan.End, where) is not { } header)
            {
                scan.HeaderIsTruncated = true;
                break;
            }

            if (index == 0)
                scan.Primary = header;
            Hdu hdu = Describe(file, header, index, scan.End);
            if (number == 1 && hdu.Kind == HduKind.CompressedImage && header.OwnTrue("ZSIMPLE") && RestoredHeader.IsBare(scan.Primary, header))
            {
                scan.Primary = RestoredHeader.Of(header, asPrimary: true);
                scan.Hdus.Clear();
                hdu = hdu with { Index = 0 };
            }

            scan.Hdus.Add(hdu);
            scan.End = hdu.DataOffset + (hdu.IsTruncated ? hdu.PresentBytes : file.Present(hdu.DataOffset, hdu.EndOffset - hdu.DataOffset));
        }

        return scan.Hdus.Count > 0 ? scan : throw NoHdu(file, scan.HeaderIsTruncated);
    }

    private static StackFormatException NoHdu(FitsFile file, bool headerIsTruncated)
    {
        byte[] start = new byte[file.Present(0, 9)];
        file.Read(start, 0);
        if (file.Damage is { } damage)
            return new StackFormatException(file.Path, damage, GetAgain);
        if (headerIsTruncated)
            return new StackFormatException($"{file.Path}, byte {file.Length}", "the file ends inside its first header", GetAgain);
        return new StackFormatException($"{file.Path}, byte 0", "not FITS: it does not begin with 'SIMPLE  ='", "check that this is the file you mean");
    }

    private static Hdu Describe(FitsFile file, FitsHeader header, int index, long offset)
    {
        if (index == 0 && !header.OwnTrue("SIMPLE"))
            throw new StackFormatException($"{header.Where}, keyword SIMPLE", "the file says itself that it is not standard FITS (SIMPLE is not T)", "convert it to standard FITS");

        (int bitPix, long[] axes) = Array(header, "");
        HduKind kind = KindOf(header, index, axes);
        long dataBytes = DataBytes(header, "", kind, bitPix, axes, index);
        if (dataBytes > file.MostInflated)
            throw new StackFormatException($"{header.Where}, keywords NAXISn", $"they promise {dataBytes} bytes, and a gzipped file of this length cannot hold more than {file.MostInflated}", GetAgain);
        long dataOffset = offset + header.Bytes;
        bool isCompressed = kind == HduKind.CompressedImage;
        bool isEmpty = kind == HduKind.Image && dataBytes == 0;
        if (isCompressed)
        {
            (bitPix, axes) = Array(header, "Z");
            isEmpty = DataBytes(header, "Z", HduKind.Image, bitPix, axes, 0) == 0;
        }

        return new Hdu
        {
            Index = index,
            Where = header.Where,
            Kind = isEmpty ? HduKind.Empty : kind,
            BitPix = bitPix,
            Axes = axes,
            Compression = isCompressed ? header.OwnText("ZCMPTYPE")?.Trim() ?? "" : null,
            Name = header.OwnText("EXTNAME")?.Trim() is { } name && !(isCompressed && name == RestoredHeader.NoName) ? name : null,
            Version = header.FindNumber("EXTVER") is { } version && Math.Abs(version) < int.MaxValue ? (long)version : null,
            HeaderOffset = offset,
            DataOffset = dataOffset,
            DataBytes = dataBytes,
            PresentBytes = file.Present(dataOffset, dataBytes),
        };
    }

    /// <summary>BITPIX, NAXIS and NAXISn; with a Z before them those of a compressed image.</summary>
    private static (int BitPix, long[] Axes) Array(FitsHeader header, string before)
    {
        int bitPix = (int)header.RequiredInteger(before + "BITPIX", -64, 64);
        if (bitPix is not (8 or 16 or 32 or 64 or -32 or -64))
            throw new StackFormatException($"{header.Where}, keyword {before}BITPIX", $"{bitPix} is none of 8, 16, 32, 64, -32, -64", GetAgain);
        long[] axes = new long[header.RequiredInteger(before + "NAXIS", 0, MostAxes)];
        for (int i = 0; i < axes.Length; i++)
            axes[i] = header.RequiredInteger(string.Create(CultureInfo.InvariantCulture, $"{before}NAXIS{i + 1}"), 0, long.MaxValue);
        return (bitPix, axes);
    }

    private static HduKind KindOf(FitsHeader header, int index, long[] axes)
    {
        if (index == 0)
            return axes.Length > 0 && axes[0] == 0 && header.OwnTrue("GROUPS") ? HduKind.RandomGroups : HduKind.Image;
        return header.OwnText("XTENSION")?.Trim() switch
        {
            "IMAGE" or "IUEIMAGE" => HduKind.Image,
            "BINTABLE" when header.OwnTrue("ZIMAGE") => HduKind.CompressedImage,
            "TABLE" or "BINTABLE" or "A3DTABLE" => HduKind.Table,
            _ => HduKind.Other,
        };
    }

    /// <summary>|BITPIX| / 8 * GCOUNT * (PCOUNT + NAXIS1 * NAXIS2 * ...): Standard 4.0, equations 1, 2 and 4.</summary>
    private static long DataBytes(FitsHeader header, string before, HduKind kind, int bitPix, long[] axes, int index)
    {
        // PCOUNT and GCOUNT mean nothing in an ordinary primary header, where some programs write them all the same.
        bool hasGroups = index > 0 || kind == HduKind.RandomGroups;
        long parameters = hasGroups ? header.OwnInteger("PCOUNT") ?? 0 : 0;
        long groups = hasGroups ? header.OwnInteger("GCOUNT") ?? 1 : 1;
        if (parameters < 0 || groups < 0)
            throw new StackFormatException(header.Where, "PCOUNT or GCOUNT is negative", GetAgain);
        if (kind == HduKind.Image && (parameters != 0 || groups != 1))
            throw new StackFormatException(header.Where, $"an image with PCOUNT = {parameters} and GCOUNT = {groups} instead of 0 and 1", GetAgain);

        try
        {
            checked
            {
                long samples = axes.Length == 0 ? 0 : 1;
                foreach (long axis in kind == HduKind.RandomGroups ? axes.AsSpan(1) : axes)
                {
                    if (axis == 0)
                        samples = 0;
                    samples *= axis;
                }

                return FitsBlock.Padded(Math.Abs(bitPix) / 8 * groups * (parameters + samples)) is var padded && padded < long.MaxValue / 4
                    ? Math.Abs(bitPix) / 8 * groups * (parameters + samples)
                    : throw new OverflowException();
            }
        }
        catch (OverflowException e)
        {
            throw new StackFormatException($"{header.Where}, keywords {before}NAXISn", "the size they give does not fit 64 bits", GetAgain, e);
        }
    }
}
