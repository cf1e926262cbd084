using System.Globalization;
using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;

namespace Stacks.Formats.Fits;

/// <summary>Which HDUs the output has and how long their headers are: all of it is known before the first frame.</summary>
internal static class OutputPlan
{
    /// <summary>Cards set aside in the primary header for provenance: five blocks.</summary>
    public const int Reserve = 5 * FitsBlock.Cards;

    /// <summary>The HDUs that come before the change masks and the ledger.</summary>
    /// <exception cref="OutputException">Frames of one HDU would get different types.</exception>
    public static IReadOnlyList<OutputHdu> Of(WriteRequest request) =>
        WithHeaderBytes(Compressed(request, WithProvenance(request.Source is FitsReader fits ? FromFits(request, fits) : FromOther(request))));

    /// <summary>
    /// Every HDU of a FITS source, in order, but for truncated ones that hold no whole frame; without carrying, the primary
    /// HDU and those with frames.
    /// </summary>
    private static IEnumerable<OutputHdu> FromFits(WriteRequest request, FitsReader source)
    {
        foreach (Hdu hdu in source.Hdus)
        {
            bool holdsFrames = hdu.Role == HduRole.Science && hdu.Planes > 0;
            if (hdu.Index > 0 && !holdsFrames && (hdu.IsTruncated || !request.Carry))
                continue;
            if (holdsFrames)
            {
                SampleType type = TypeOf(request, hdu.FirstFrame, (int)hdu.Planes, hdu.Label);
                IReadOnlyList<long> axes = hdu.IsTruncated ? [hdu.Axes[0], hdu.Axes[1], hdu.Planes] : hdu.Axes;
                List<FitsCard> MakeCards()
                {
                    List<FitsCard> cards = HeaderEdit.OverFrames(source.ReadHeader(hdu), hdu, axes, type);
                    return hdu.Index == 0 ? HeaderEdit.AsPrimary(cards, request.Created) : cards;
                }

                yield return Frames(hdu.Label, MakeCards, axes, hdu.FirstFrame, (int)hdu.Planes, type);
            }
            else if (hdu.Index == 0 && hdu.Kind == HduKind.CompressedImage)
            {
                yield return new OutputHdu { Label = hdu.Label, MakeCards = () => HeaderEdit.AsPrimary(NewHeader.EmptyPrimary(), request.Created) };
                yield return Whole(hdu);
            }
            else if (hdu.Index == 0)
            {
                yield return new OutputHdu
                {
                    Label = hdu.Label,
                    MakeCards = () => HeaderEdit.AsPrimary([.. HeaderEdit.Carried(source.Primary)], request.Created),
                    Carried = hdu,
                    DataBytes = hdu.DataBytes,
                };
            }
            else
            {
                yield return Whole(hdu);
            }
        }
    }

    /// <summary>An HDU of the source that is carried byte for byte.</summary>
    private static OutputHdu Whole(Hdu hdu) => new() { Label = hdu.Label, Carried = hdu, HeaderBytes = hdu.DataOffset - hdu.HeaderOffset, DataBytes = hdu.DataBytes };

    /// <summary>A source of another format: one cube when all frames are alike, else an extension for each.</summary>
    private static IEnumerable<OutputHdu> FromOther(WriteRequest request)
    {
        IStackReader source = request.Source;
        FrameLayout first = source.Layout(0);
        SampleType firstType = request.SampleTypeOf(0);
        bool isCube = Enumerable.Range(0, source.FrameCount).All(i =>
            request.SampleTypeOf(i) == firstType && NewHeader.IsAlike(source.Layout(i), first));
        if (isCube)
        {
            IReadOnlyList<long> axes = source.FrameCount == 1 ? [first.Width, first.Height] : [first.Width, first.Height, source.FrameCount];
            yield return Frames("primary", () => HeaderEdit.AsPrimary(NewHeader.Primary(axes, first, firstType), request.Created), axes, 0, source.FrameCount, firstType);
            yield break;
        }

        yield return new OutputHdu { Label = "primary", MakeCards = () => HeaderEdit.AsPrimary(NewHeader.EmptyPrimary(), request.Created) };
        for (int i = 0; i < source.FrameCount; i++)
        {
            FrameLayout layout = source.Layout(i);
            IReadOnlyList<long> axes = [layout.Width, layout.Height];
            SampleType type = request.SampleTypeOf(i);
            int version = i + 1;
            yield return Frames(string.Create(CultureInfo.InvariantCulture, $"{NewHeader.ExtensionName},{version}"), () => NewHeader.Extension(axes, layout, type, version), axes, i, 1, type);
        }
    }

    private static OutputHdu Frames(string label, Func<List<FitsCard>> makeCards, IReadOnlyList<long> axes, int first, int count, SampleType type) => new()
    {
        Label = label,
        MakeCards = makeCards,
        FirstFrame = first,
        Frames = count,
        Axes = axes,
        SampleType = type,
        DataBytes = axes.Aggregate(1L, (product, axis) => product * axis) * type.Size(),
    };

    /// <summary>The first HDU's header holds the provenance.</summary>
    private static IEnumerable<OutputHdu> WithProvenance(IEnumerable<OutputHdu> hdus) => hdus.Select((hdu, i) => hdu with { HoldsProvenance = i == 0 });

    /// <summary>
    /// Frames in tables of tiles, where compression is asked for. No table can be the primary HDU: frames of the primary
    /// array become extension 1, with their header and the provenance in it, so that these stand in the primary header
    /// again when the file is unpacked.
    /// </summary>
    private static IEnumerable<OutputHdu> Compressed(WriteRequest request, IEnumerable<OutputHdu> hdus)
    {
        foreach ((int i, OutputHdu hdu) in hdus.Index())
        {
            bool isCompressed = request.Compression == OutputCompression.Lossless && hdu.Frames > 0;
            if (isCompressed && i == 0)
                yield return new OutputHdu { Label = hdu.Label, MakeCards = TileHeader.BarePrimary };
            yield return isCompressed ? hdu with { Tiles = new TilePlan(hdu.SampleType, hdu.Axes), DataBytes = 0 } : hdu;
        }
    }

    /// <summary>Sets aside the bytes of each header.</summary>
    private static List<OutputHdu> WithHeaderBytes(IEnumerable<OutputHdu> hdus) =>
        [.. hdus.Select(hdu => hdu.MakeCards is { } makeCards ? hdu with { HeaderBytes = HeaderImage.BytesFor(CardCount(hdu, makeCards())) } : hdu)];

    private static int CardCount(OutputHdu hdu, List<FitsCard> cards) =>
        (hdu.Tiles is { } tiles ? TileHeader.Of(cards, tiles, 0, 0).Count : cards.Count) + (hdu.HoldsProvenance ? Reserve : 0);

    private static SampleType TypeOf(WriteRequest request, int first, int count, string label)
    {
        SampleType type = request.SampleTypeOf(first);
        for (int i = first + 1; i < first + count; i++)
        {
            if (request.SampleTypeOf(i) != type)
                throw new OutputException(request.Path, string.Create(CultureInfo.InvariantCulture, $"frames {first} and {i} of {label} would get different sample types, and one FITS image has one"), "state one in the recipe: [output] samples");
        }

        return type;
    }
}
