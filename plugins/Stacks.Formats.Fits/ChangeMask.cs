using System.Buffers.Binary;
using System.Globalization;
using System.IO.Compression;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// The change masks: 8-bit images of <see cref="SampleFlags"/> in tiles of one frame, compressed by GZIP_1 (Standard
/// 4.0, section 10). The tiles wait in a file of their own, because how long they are is known only at the end.
/// </summary>
internal sealed class ChangeMask : IDisposable
{
    /// <summary>EXTNAME of a change mask.</summary>
    public const string ExtensionName = "CHANGES";

    private const int CopyBytes = 1 << 17;
    private readonly PartialFile spool;
    private readonly List<int> lengths = [];
    private long end;

    /// <summary>Creates the waiting file; it is removed when this is disposed.</summary>
    public ChangeMask(string outputPath) => spool = new PartialFile(outputPath + ".changes.partial", FileOptions.DeleteOnClose);

    /// <summary>True for a change mask that an earlier run of this program wrote, also when it was unpacked since.</summary>
    public static bool IsOurs(Hdu hdu) => hdu.IsImage && hdu.BitPix == 8 && hdu.Name == ExtensionName;

    /// <summary>Compresses the flags of a frame into a tile.</summary>
    public static void Compress(ReadOnlySpan<byte> flags, ByteBuffer tile)
    {
        tile.Resize(0);
        using GZipStream gzip = new(new ByteBufferStream(tile), CompressionLevel.Fastest);
        gzip.Write(flags);
    }

    /// <summary>Adds the tile of the next frame.</summary>
    public void Append(ReadOnlySpan<byte> tile)
    {
        spool.Write(tile, end);
        end += tile.Length;
        lengths.Add(tile.Length);
    }

    /// <summary>Writes the change mask of one HDU as an extension at an offset; returns the offset behind it.</summary>
    /// <param name="output">The file.</param>
    /// <param name="offset">The offset.</param>
    /// <param name="hdu">The HDU with the frames that the flags are for.</param>
    /// <param name="version">EXTVER.</param>
    /// <param name="longestShortHeap">Bytes of tiles beyond which their offsets take 64 bits.</param>
    public long WriteExtension(PartialFile output, long offset, OutputHdu hdu, long version, long longestShortHeap = int.MaxValue)
    {
        List<int> tiles = lengths.GetRange(hdu.FirstFrame, hdu.Frames);
        long heapBytes = tiles.Sum(length => (long)length);
        bool isLong = heapBytes > longestShortHeap;
        List<FitsCard> cards = Header(hdu, version, tiles, heapBytes, isLong);
        long headerBytes = HeaderImage.BytesFor(cards.Count);
        DataUnit data = new(output, offset + headerBytes);

        long heapOffset = 0;
        Span<byte> descriptor = stackalloc byte[16];
        foreach (int length in tiles)
        {
            if (isLong)
            {
                BinaryPrimitives.WriteInt64BigEndian(descriptor, length);
                BinaryPrimitives.WriteInt64BigEndian(descriptor[8..], heapOffset);
                data.Append(descriptor);
            }
            else
            {
                BinaryPrimitives.WriteInt32BigEndian(descriptor, length);
                BinaryPrimitives.WriteInt32BigEndian(descriptor[4..], (int)heapOffset);
                data.Append(descriptor[..8]);
            }

            heapOffset += length;
        }

        byte[] buffer = new byte[CopyBytes];
        long from = 0;
        for (int frame = 0; frame < hdu.FirstFrame; frame++)
            from += lengths[frame];
        for (long left = heapBytes; left > 0;)
        {
            Span<byte> part = buffer.AsSpan(0, (int)Math.Min(left, buffer.Length));
            spool.Read(part, from);
            data.Append(part);
            from += part.Length;
            left -= part.Length;
        }

        long after = data.Pad();
        output.Write(HeaderImage.Build(cards, headerBytes, data.Sum), offset);
        return after;
    }

    /// <inheritdoc/>
    public void Dispose() => spool.Dispose();

    private static List<FitsCard> Header(OutputHdu hdu, long version, List<int> tiles, long heapBytes, bool isLong)
    {
        // Readers in use decode compressed images of at most 3 axes: the frames of a 4-D array stand one behind the other.
        IReadOnlyList<long> axes = hdu.Axes.Count > 3 ? [hdu.Axes[0], hdu.Axes[1], hdu.Frames] : hdu.Axes;
        List<FitsCard> cards =
        [
            .. FitsCard.Text("XTENSION", "BINTABLE", "an image in compressed tiles"),
            FitsCard.Integer("BITPIX", 8, ""),
            FitsCard.Integer("NAXIS", 2, ""),
            FitsCard.Integer("NAXIS1", isLong ? 16 : 8, "bytes of a row"),
            FitsCard.Integer("NAXIS2", tiles.Count, "tiles, one a frame"),
            FitsCard.Integer("PCOUNT", heapBytes, "bytes of the tiles"),
            FitsCard.Integer("GCOUNT", 1, ""),
            FitsCard.Integer("TFIELDS", 1, ""),
            .. FitsCard.Text("TTYPE1", "COMPRESSED_DATA", ""),
            .. FitsCard.Text("TFORM1", string.Create(CultureInfo.InvariantCulture, $"1{(isLong ? 'Q' : 'P')}B({tiles.Max()})"), ""),
            FitsCard.Logical("ZIMAGE", true, "an image in compressed tiles"),
            .. FitsCard.Text("ZTENSION", "IMAGE", ""),
            FitsCard.Integer("ZBITPIX", 8, "a byte a sample"),
            FitsCard.Integer("ZNAXIS", axes.Count, ""),
        ];
        for (int i = 0; i < axes.Count; i++)
            cards.Add(FitsCard.Integer(string.Create(CultureInfo.InvariantCulture, $"ZNAXIS{i + 1}"), axes[i], ""));
        for (int i = 0; i < axes.Count; i++)
            cards.Add(FitsCard.Integer(string.Create(CultureInfo.InvariantCulture, $"ZTILE{i + 1}"), i < 2 ? axes[i] : 1, ""));
        cards.AddRange(
        [
            FitsCard.Integer("ZPCOUNT", 0, ""),
            FitsCard.Integer("ZGCOUNT", 1, ""),
            .. FitsCard.Text("ZCMPTYPE", "GZIP_1", ""),
            .. FitsCard.Text("EXTNAME", ExtensionName, "what became of every sample"),
            FitsCard.Integer("EXTVER", version, ""),
            .. FitsCard.Text("STKOF", hdu.Label, "the image these flags are for"),
            .. FitsCard.Commentary("COMMENT", "Flags of each sample, the sum of:"),
        ]);
        foreach ((SampleFlags flag, string meaning) in Meanings)
            cards.AddRange(FitsCard.Commentary("COMMENT", string.Create(CultureInfo.InvariantCulture, $"{(int)flag,4} {meaning}")));
        return cards;
    }

    private static (SampleFlags Flag, string Meaning)[] Meanings { get; } =
    [
        (SampleFlags.Missing, "missing: NaN, infinite, BLANK or masked; as stored"),
        (SampleFlags.Saturated, "saturated; as stored"),
        (SampleFlags.Defect, "in the defect list; replaced in every frame"),
        (SampleFlags.ReplacedBright, "replaced; it stood above its surroundings"),
        (SampleFlags.ReplacedDark, "replaced; it stood below its surroundings"),
        (SampleFlags.KeptAsSource, "a candidate that was kept as a source; as stored"),
    ];
}
