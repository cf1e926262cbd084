using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;

namespace Stacks.Formats.Fits;

/// <summary>
/// Writes a FITS file: each frame behind the last one as it comes; carried parts, headers, change masks and ledger at the
/// end, when checksums and provenance are known. An HDU's place is known when the frames before it are written.
/// </summary>
internal sealed class FitsWriter : IStackWriter
{
    private const int CopyBytes = 1 << 17;
    private readonly WriteRequest request;
    private readonly IReadOnlyList<OutputHdu> hdus;
    private readonly uint[] dataSums;
    private readonly long[] offsets;
    private readonly int[] framesAt;
    private readonly TileTable?[] tables;
    private readonly PartialFile output;
    private readonly ChangeMask? mask;
    private int current;
    private DataUnit? frames;

    /// <summary>Creates the file under its partial name.</summary>
    public FitsWriter(WriteRequest request)
    {
        if (new FitsFormat().CannotCompress(request.Compression) is { } fault)
            throw new OutputException(request.Path, $"cannot be compressed so: {fault}", "change [output] compression in the recipe");
        this.request = request;
        hdus = OutputPlan.Of(request);
        dataSums = new uint[hdus.Count];
        offsets = new long[hdus.Count];
        framesAt = [.. hdus.Index().Where(hdu => hdu.Item.Frames > 0).Select(hdu => hdu.Index)];
        tables = new TileTable?[hdus.Count];
        string partial = request.Path + ".partial";
        Files = [new OutputFile(partial, request.Path)];
        output = new PartialFile(partial);
        mask = request.Mask ? new ChangeMask(request.Path) : null;
    }

    /// <inheritdoc/>
    public IReadOnlyList<OutputFile> Files { get; }

    /// <inheritdoc/>
    public void Encode(int frame, Span<byte> stored, ReadOnlySpan<byte> flags, EncodedFrame encoded)
    {
        if (HduOf(frame).Tiles is { } tiles)
            TileEncoder.Encode(tiles, stored, encoded.Data);
        else
            SampleEncoding.Encode(request.SampleTypeOf(frame), stored, encoded.Data.Resize(stored.Length));
        if (mask is not null)
            ChangeMask.Compress(flags, encoded.Mask);
        else
            encoded.Mask.Resize(0);
    }

    /// <inheritdoc/>
    public void Write(int frame, EncodedFrame encoded)
    {
        while (frame >= hdus[current].FirstFrame + hdus[current].Frames)
            GoOn();
        OutputHdu hdu = hdus[current];
        if (hdu.Tiles is not null)
        {
            TileTable table = tables[current] ??= new TileTable(output, DataOffset(current), hdu.Tiles);
            table.Append(encoded.Data.Written);
            if (frame == hdu.FirstFrame + hdu.Frames - 1)
                dataSums[current] = table.Finish();
        }
        else
        {
            if (frame == hdu.FirstFrame)
                frames = new DataUnit(output, DataOffset(current));
            frames!.Append(encoded.Data.Written);
            if (frame == hdu.FirstFrame + hdu.Frames - 1)
            {
                frames.Pad();
                dataSums[current] = frames.Sum;
            }
        }

        mask?.Append(encoded.Mask.Written);
    }

    /// <inheritdoc/>
    public void Complete(ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
    {
        while (current < hdus.Count - 1)
            GoOn();
        for (int i = 0; i < hdus.Count; i++)
        {
            OutputHdu hdu = hdus[i];
            if (hdu.Carried is { } carried)
                dataSums[i] = hdu.MakeCards is null ? CopyWhole(carried, offsets[i]) : Copy(carried.DataOffset, carried.PresentBytes, DataOffset(i));
            if (hdu.MakeCards is not { } makeCards)
                continue;
            List<FitsCard> cards = makeCards();
            if (tables[i] is { } table)
                cards = TileHeader.Of(cards, hdu.Tiles!, table.HeapBytes, table.Longest);
            if (hdu.HoldsProvenance)
            {
                bool longStrings = cards.Any(card => card.Is("LONGSTRN"));
                cards.AddRange(ProvenanceCards.Of(provenance, Losses(), longStrings, HeaderImage.RoomFor(hdu.HeaderBytes) - cards.Count));
            }

            output.Write(HeaderImage.Build(cards, hdu.HeaderBytes, dataSums[i]), offsets[i]);
        }

        long end = EndOf(hdus.Count - 1);
        if (mask is not null)
        {
            long version = NextVersion(ChangeMask.ExtensionName);
            foreach (OutputHdu hdu in hdus.Where(h => h.Frames > 0))
                end = mask.WriteExtension(output, end, hdu, version++);
        }

        LedgerTable.WriteExtension(output, end, ledger, request.Source.Layout, NextVersion(LedgerTable.ExtensionName));
    }

    /// <inheritdoc/>
    public void Dispose()
    {
        output.Dispose();
        mask?.Dispose();
    }

    /// <summary>Goes on to the next HDU, which starts behind this one.</summary>
    private void GoOn()
    {
        offsets[current + 1] = EndOf(current);
        current++;
    }

    private long DataOffset(int hdu) => offsets[hdu] + hdus[hdu].HeaderBytes;

    private long EndOf(int hdu) => DataOffset(hdu) + FitsBlock.Padded(tables[hdu]?.Bytes ?? hdus[hdu].DataBytes);

    /// <summary>The HDU of a frame, by bisection: workers ask in any order.</summary>
    private OutputHdu HduOf(int frame)
    {
        int low = 0, high = framesAt.Length - 1;
        while (low < high)
        {
            int middle = (low + high + 1) / 2;
            if (hdus[framesAt[middle]].FirstFrame <= frame)
                low = middle;
            else
                high = middle - 1;
        }

        return hdus[framesAt[low]];
    }

    private uint CopyWhole(Hdu carried, long to) => Copy(carried.HeaderOffset, carried.DataOffset - carried.HeaderOffset + carried.PresentBytes, to);

    /// <summary>Copies bytes of the source, fills their last block, and returns their sum.</summary>
    private uint Copy(long from, long bytes, long to)
    {
        FitsFile source = ((FitsReader)request.Source).File;
        DataUnit copy = new(output, to);
        byte[] buffer = new byte[CopyBytes];
        for (long left = bytes; left > 0;)
        {
            Span<byte> part = buffer.AsSpan(0, (int)Math.Min(left, buffer.Length));
            source.Read(part, from);
            copy.Append(part);
            from += part.Length;
            left -= part.Length;
        }

        copy.Pad();
        return copy.Sum;
    }

    /// <summary>What of the source is not in the output.</summary>
    private IEnumerable<string> Losses()
    {
        IEnumerable<StackPart> lost = request.Source is FitsReader
            ? request.Source.Parts.Where((part, i) => part.Fate.Contains("not carried", StringComparison.Ordinal)
                || part.Fate.StartsWith("truncated", StringComparison.Ordinal)
                || (!request.Carry && i > 0 && part.Role != "science"))
            : request.Source.Parts.Where(part => part.Role is not ("science" or "empty"));
        return lost.Select(part => $"{part.Name} of the source: {(part.Fate == "carried" ? "not carried" : part.Fate)} ({part.Role}, {part.Shape})");
    }

    /// <summary>EXTVER for an extension that an earlier run may have written too.</summary>
    private long NextVersion(string name) => request.Source is FitsReader source
        ? source.Hdus.Where(h => h.Name == name).Select(h => h.Version ?? 1).DefaultIfEmpty(0).Max() + 1
        : 1;
}
