using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// Writes a FITS file: each frame at its place as it comes; carried parts, headers, change masks and ledger at the end,
/// when checksums and provenance are known.
/// </summary>
internal sealed class FitsWriter : IStackWriter
{
    private const int CopyBytes = 1 << 17;
    private readonly WriteRequest request;
    private readonly IReadOnlyList<OutputHdu> hdus;
    private readonly uint[] dataSums;
    private readonly PartialFile output;
    private readonly ChangeMask? mask;
    private int current;
    private DataUnit? frames;

    /// <summary>Creates the file under its partial name.</summary>
    public FitsWriter(WriteRequest request)
    {
        if (request.Compression != OutputCompression.None)
            throw new OutputException(request.Path, "compressed FITS is not written yet", "set [output] compression = \"none\" in the recipe");
        this.request = request;
        hdus = OutputPlan.Of(request);
        dataSums = new uint[hdus.Count];
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
            current++;
        OutputHdu hdu = hdus[current];
        if (frame == hdu.FirstFrame)
            frames = new DataUnit(output, hdu.DataOffset);
        frames!.Append(encoded.Data.Written);
        if (frame == hdu.FirstFrame + hdu.Frames - 1)
        {
            frames.Pad();
            dataSums[current] = frames.Sum;
        }

        mask?.Append(encoded.Mask.Written);
    }

    /// <inheritdoc/>
    public void Complete(ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
    {
        for (int i = 0; i < hdus.Count; i++)
        {
            OutputHdu hdu = hdus[i];
            if (hdu.Carried is { } carried)
                dataSums[i] = hdu.MakeCards is null ? CopyWhole(carried, hdu) : Copy(carried.DataOffset, carried.PresentBytes, hdu.DataOffset);
            if (hdu.MakeCards is not { } makeCards)
                continue;
            List<FitsCard> cards = makeCards();
            if (i == 0)
            {
                bool longStrings = cards.Any(card => card.Is("LONGSTRN"));
                cards.AddRange(ProvenanceCards.Of(provenance, Losses(), longStrings, HeaderImage.RoomFor(hdu.HeaderBytes) - cards.Count));
            }

            output.Write(HeaderImage.Build(cards, hdu.HeaderBytes, dataSums[i]), hdu.Offset);
        }

        long end = hdus[^1].End;
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

    private uint CopyWhole(Hdu carried, OutputHdu hdu) => Copy(carried.HeaderOffset, carried.DataOffset - carried.HeaderOffset + carried.PresentBytes, hdu.Offset);

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
    private IEnumerable<string> Losses() => request.Source.Parts
        .Where(part => part.Fate.Contains("not carried", StringComparison.Ordinal) || part.Fate.StartsWith("truncated", StringComparison.Ordinal))
        .Select(part => $"{part.Name} of the source: {part.Fate}");

    /// <summary>EXTVER for an extension that an earlier run may have written too.</summary>
    private long NextVersion(string name) => request.Source is FitsReader source
        ? source.Hdus.Where(h => h.Name == name).Select(h => h.Version ?? 1).DefaultIfEmpty(0).Max() + 1
        : 1;
}
