using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// Writes a stack as TIFF. From a TIFF source it keeps byte order, order of pages, thumbnails and every field that does
/// not say how samples are stored. A page of several samples a pixel stays one page, with its number of samples, their
/// meaning (PhotometricInterpretation, ExtraSamples) and their order; its samples are stored in planes
/// (PlanarConfiguration 2) whether they were or not, because each plane is a frame of its own.
/// </summary>
internal sealed class TiffWriter : IStackWriter
{
    private const int Named = 20;
    private readonly WriteRequest request;
    private readonly TiffReader? source;
    private readonly OmeSetReader? set;
    private readonly Dictionary<OmeImage, SampleType> newOmeTypes = [];
    private readonly PageFile stack;
    private readonly PageFile? mask;

    /// <summary>Creates the files.</summary>
    /// <exception cref="OutputException">A file cannot be created, or TIFF cannot say what a frame's samples mean.</exception>
    public TiffWriter(WriteRequest request)
    {
        this.request = request;
        source = request.Source as TiffReader;
        set = request.Source as OmeSetReader;
        CheckMeaning();
        CheckSamplesOfPixels();
        FindNewOmeTypes();
        List<OutputFile> files = [new(request.Path + ".partial", request.Path)];
        if (request.Mask)
        {
            string companion = System.IO.Path.ChangeExtension(request.Path, null) + ".changes.tif";
            files.Add(new OutputFile(companion + ".partial", companion));
        }

        Files = files;
        bool bigEndian = source is { File.BigEndian: true } || set is { Set.BigEndian: true };
        IsBig = source is { File.IsBig: true } || set is { Set.IsBig: true } || MayPass4GiB(TypeOf);
        stack = new PageFile(files[0].Partial, bigEndian, IsBig, request.Compression switch
        {
            OutputCompression.None => Compression.None,
            OutputCompression.Zstd => Compression.Zstd,
            _ => Compression.Deflate,
        });
        try
        {
            if (request.Mask)
                mask = new PageFile(files[1].Partial, bigEndian, MayPass4GiB(_ => SampleType.UInt8), Compression.Deflate);
        }
        catch
        {
            stack.Dispose();
            throw;
        }
    }

    /// <inheritdoc/>
    public IReadOnlyList<OutputFile> Files { get; }

    /// <summary>True when the stack is written as BigTIFF.</summary>
    internal bool IsBig { get; }

    /// <inheritdoc/>
    public void Encode(int frame, Span<byte> stored, ReadOnlySpan<byte> flags, EncodedFrame encoded)
    {
        FrameLayout layout = request.Source.Layout(frame);
        stack.Encode(layout, TypeOf(frame), stored, encoded.Data);
        encoded.Mask.Resize(0);
        if (mask is null)
            return;
        Span<byte> copy = stored[..flags.Length];
        flags.CopyTo(copy);
        mask.Encode(layout, SampleType.UInt8, copy, encoded.Mask);
    }

    /// <inheritdoc/>
    public void Write(int frame, EncodedFrame encoded)
    {
        if (frame != stack.Frames)
            throw new InvalidOperationException($"frame {frame} comes where frame {stack.Frames} is due");
        FrameLayout layout = request.Source.Layout(frame);
        stack.Append(layout, TypeOf(frame), encoded.Data.Written);
        mask?.Append(layout, SampleType.UInt8, encoded.Mask.Written);
    }

    /// <inheritdoc/>
    public void Complete(ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
    {
        int frames = request.Source.FrameCount;
        if (stack.Frames != frames)
            throw new InvalidOperationException($"{stack.Frames} of {frames} frames were written");
        List<OutputField> first = FirstPage(provenance with { Remarks = [.. provenance.Remarks, .. NotCarried()] }, ledger);
        if (source is null)
            WritePlainPages(first, ledger);
        else
            WritePagesOfSource(source, first, ledger);
        stack.Finish();
        if (mask is not null)
        {
            WriteMaskPages(mask);
            mask.Finish();
        }
    }

    /// <inheritdoc/>
    public void Dispose()
    {
        stack.Dispose();
        mask?.Dispose();
    }

    /// <summary>The fields of the first page that say who made the file from what: in OME-XML where there is some, else in XMP.</summary>
    private List<OutputField> FirstPage(ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
    {
        List<OutputField> first =
        [
            DirectoryWriter.Text(Tag.Software, $"{provenance.Program} {provenance.Version}"),
            DirectoryWriter.Text(Tag.DateTime, request.Created.UtcDateTime.ToString("yyyy:MM:dd HH:mm:ss", CultureInfo.InvariantCulture)),
        ];
        if ((set?.Set.Ome ?? source?.Metadata.Ome) is { MetadataFile: null } ome)
        {
            string text = OmeResult.Text(ome, MovedPlanes(), newOmeTypes, System.IO.Path.GetFileName(request.Path), provenance, ledger);
            first.Add(DirectoryWriter.Text(Tag.ImageDescription, text));
        }
        else
        {
            byte[] packet = XmpPacket.Make(source?.Metadata.Xmp, provenance, ledger);
            first.Add(new OutputField(Tag.Xmp, FieldType.Byte, packet.Length, packet));
        }

        return first;
    }

    /// <summary>The planes of each TiffData element with their pages in the result; null where every page keeps its number.</summary>
    private ILookup<TextSpan, (int Page, OmePlane Plane)>? MovedPlanes()
    {
        if (set is not null)
            return set.Set.Planes.Select((p, frame) => (p.Data.At, frame, p.Plane)).ToLookup(p => p.At, p => (p.frame, p.Plane));
        int next = 0;
        int[] numbers = [.. source!.Index.Pages.Select(p => IsCarried(p) ? next++ : -1)];
        return next == numbers.Length ? null : OmePlanes.Renumbered(source.Metadata.Ome!.Images, numbers);
    }

    private bool IsCarried(Page page) => page.Layout.Carried && (request.Carry || page.Layout.Frame is not null);

    /// <summary>What of the source is not in the result, a sentence each.</summary>
    private IEnumerable<string> NotCarried()
    {
        List<string> parts =
        [
            .. request.Source.Parts
                .Where(p => source is null && set is null ? p.Role is not ("science" or "empty") : p.Fate == "not carried" || (!request.Carry && p.Role == "thumbnail"))
                .Select(p => $"not carried: {p.Name} of the source ({p.Role}, {p.Shape})"),
        ];
        return parts.Count <= Named
            ? parts
            : parts.Take(Named).Append(string.Create(CultureInfo.InvariantCulture, $"not carried: {parts.Count - Named} more parts of the source"));
    }

    /// <summary>A page for each frame; of a set of files, with the fields that the frame's own page carries.</summary>
    private void WritePlainPages(List<OutputField> first, IReadOnlyList<LedgerRow> ledger)
    {
        int frames = request.Source.FrameCount;
        for (int f = 0; f < frames; f++)
        {
            FrameLayout layout = request.Source.Layout(f);
            IEnumerable<OutputField> carried = [];
            if (set is not null)
            {
                bool typeChanged = TypeOf(f) != layout.SampleType;
                bool changed = typeChanged || !ledger[f].SourceDigest.AsSpan().SequenceEqual(ledger[f].ResultDigest);
                carried = set.CarriedFieldsOf(f, typeChanged, changed);
            }

            // The text of the set goes into the first page; the links of the others to it no longer hold.
            IEnumerable<OutputField> fields = stack.ImageFields(f, layout, TypeOf(f)).Concat(carried.Where(c => c.Tag != Tag.ImageDescription)).Append(stack.BlackIsZero);
            stack.WriteDirectory(f == 0 ? first.Concat(fields) : fields, f == frames - 1);
        }
    }

    private void WritePagesOfSource(TiffReader from, List<OutputField> first, IReadOnlyList<LedgerRow> ledger)
    {
        IReadOnlyList<Page> pages = [.. from.Index.Pages.Where(IsCarried)];
        FileWindow window = new(from.File);
        SegmentTable table = new(from.File);
        Dictionary<long, IEnumerable<OutputField>> copied = [];
        foreach (Page page in pages.Where(p => p.Layout.Frame is null))
        {
            table.Load(page);
            bool tiled = TiffDirectory.Read(from.File, window, page.Directory, from.Path).Find(Tag.TileOffsets) is not null;
            copied[page.Directory] = stack.Copy(from.File, table, tiled);
        }

        int frame = 0;
        for (int p = 0; p < pages.Count; p++)
        {
            TiffDirectory directory = TiffDirectory.Read(from.File, window, pages[p].Directory, from.Path);
            IEnumerable<OutputField> fields;
            if (pages[p].Layout.Frame is { } layout)
            {
                SampleType type = TypeOf(frame);
                int samples = pages[p].Layout.Samples;
                bool changed = type != layout.SampleType
                    || ledger.Skip(frame).Take(samples).Any(row => !row.SourceDigest.AsSpan().SequenceEqual(row.ResultDigest));
                fields = stack.ImageFields(frame, layout, type, samples)
                    .Concat(CarriedFields.OfScience(from.File, directory, type != layout.SampleType, changed))
                    .Append(stack.BlackIsZero);
                frame += samples;
            }
            else
            {
                fields = copied[pages[p].Directory].Concat(CarriedFields.OfThumbnail(from.File, directory));
            }

            stack.WriteDirectory(p == 0 ? first.Concat(fields) : fields, p == pages.Count - 1);
        }
    }

    private void WriteMaskPages(PageFile file)
    {
        int frames = request.Source.FrameCount;
        OutputField description = DirectoryWriter.Text(
            Tag.ImageDescription,
            $"Change mask of {System.IO.Path.GetFileName(request.Path)}, one page per frame in the same order. Bits of each sample: "
            + string.Join(", ", Enum.GetValues<SampleFlags>().Where(f => byte.IsPow2((byte)f)).Select(f => $"{(byte)f} {f}")) + ".");
        for (int f = 0; f < frames; f++)
        {
            IEnumerable<OutputField> fields = file.ImageFields(f, request.Source.Layout(f), SampleType.UInt8).Append(file.BlackIsZero);
            file.WriteDirectory(f == 0 ? fields.Append(description) : fields, f == frames - 1);
        }
    }

    private SampleType TypeOf(int frame) => request.SampleTypeOf(frame);

    /// <summary>An upper bound of the file's size, so that no offset of a classic file can ever wrap.</summary>
    private bool MayPass4GiB(Func<int, SampleType> typeOf)
    {
        long bound = 1 << 20;
        if (source is not null)
            bound += (2 * (source.File.Length - Math.Min(source.File.Length, source.Index.ImageBytes))) + source.Index.ThumbnailBytes;
        if (set is not null)
            bound += 2 * (set.Set.OtherBytes + set.Set.Ome.Xml.Text.Length);
        for (int f = 0; f < request.Source.FrameCount; f++)
        {
            FrameLayout layout = request.Source.Layout(f);
            long bytes = layout.Length * typeOf(f).Size();
            bound += bytes + (bytes >> 10) + 4096 + (16 * SegmentGrid.Strips(layout.Width, layout.Height, typeOf(f).Size()).Count);
        }

        return bound > uint.MaxValue;
    }

    /// <summary>TIFF has no fields for a scale, a zero or a missing value of stored samples.</summary>
    private void CheckMeaning()
    {
        for (int f = 0; source is null && f < request.Source.FrameCount; f++)
        {
            FrameLayout layout = request.Source.Layout(f);
            if (TypeOf(f) == layout.SampleType && (!layout.Transform.IsIdentity || layout.Blank is not null))
                throw new OutputException(
                    string.Create(CultureInfo.InvariantCulture, $"{request.Path}, frame {f}"),
                    "the source gives its samples a scale, a zero or a missing value, for which TIFF has no fields",
                    "ask for samples = \"float32\" or \"float64\" in the recipe's [output], or for format = \"same\"");
        }
    }

    /// <summary>A TIFF reader expects one sample type for all samples of a pixel.</summary>
    private void CheckSamplesOfPixels()
    {
        for (int f = 1; source is not null && f < source.FrameCount; f++)
        {
            if (source.PageNumber(f) == source.PageNumber(f - 1) && TypeOf(f) != TypeOf(f - 1))
                throw new OutputException(
                    string.Create(CultureInfo.InvariantCulture, $"{request.Path}, frame {f}"),
                    $"its samples would be {TypeOf(f).Name()} and those of another sample of the same pixels {TypeOf(f - 1).Name()}, which few readers of TIFF understand",
                    "ask for samples = \"same\" or \"float32\" in the recipe's [output]");
        }
    }

    /// <summary>Finds the images whose sample type changes. OME-XML states one type for all channels of an image.</summary>
    private void FindNewOmeTypes()
    {
        Dictionary<OmeImage, SampleType> types = [];
        for (int f = 0; f < request.Source.FrameCount; f++)
        {
            if ((set is null ? source?.Metadata.Planes?[source.PageNumber(f)] : set.Set.Planes[f].Plane) is not { } plane)
                continue;
            SampleType type = TypeOf(f);
            if (!types.TryAdd(plane.Image, type) && types[plane.Image] != type)
            {
                throw new OutputException(
                    string.Create(CultureInfo.InvariantCulture, $"{request.Path}, frame {f}"),
                    $"its samples would be {type.Name()} and those of another channel {types[plane.Image].Name()}, for which OME-TIFF has no words",
                    "ask for samples = \"same\" or \"float32\" in the recipe's [output]");
            }

            if (type != request.Source.Layout(f).SampleType)
                newOmeTypes[plane.Image] = type;
        }
    }
}
