using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Which HDUs the output has and where they stand: all of it is known before the first frame.</summary>
internal static class OutputPlan
{
    /// <summary>Cards set aside in the primary header for provenance: five blocks.</summary>
    public const int Reserve = 5 * FitsBlock.Cards;

    /// <summary>The HDUs that come before the change masks and the ledger.</summary>
    /// <exception cref="OutputException">Frames of one HDU would get different types.</exception>
    public static IReadOnlyList<OutputHdu> Of(WriteRequest request) =>
        Place(request.Source is FitsReader fits ? FromFits(request, fits) : FromOther(request));

    /// <summary>Every HDU of a FITS source, in order, but for truncated ones that hold no whole frame.</summary>
    private static IEnumerable<OutputHdu> FromFits(WriteRequest request, FitsReader source)
    {
        foreach (Hdu hdu in source.Hdus)
        {
            bool holdsFrames = hdu.Role == HduRole.Science && hdu.Planes > 0;
            if (hdu.Index > 0 && hdu.IsTruncated && !holdsFrames)
                continue;
            if (holdsFrames)
            {
                SampleType type = TypeOf(request, hdu.FirstFrame, (int)hdu.Planes, hdu.Label);
                IReadOnlyList<long> axes = hdu.IsTruncated ? [hdu.Axes[0], hdu.Axes[1], hdu.Planes] : hdu.Axes;
                List<FitsCard> cards = HeaderEdit.OverFrames(source.ReadHeader(hdu), hdu, axes, type);
                if (hdu.Index == 0)
                    HeaderEdit.MakePrimary(cards, request.Created);
                yield return new OutputHdu
                {
                    Label = hdu.Label,
                    Cards = cards,
                    FirstFrame = hdu.FirstFrame,
                    Frames = (int)hdu.Planes,
                    Axes = axes,
                    SampleType = type,
                    DataBytes = hdu.Planes * hdu.Layout!.Length * type.Size(),
                };
            }
            else if (hdu.Index == 0)
            {
                List<FitsCard> cards = [.. HeaderEdit.Carried(source.Primary)];
                HeaderEdit.MakePrimary(cards, request.Created);
                yield return new OutputHdu { Label = hdu.Label, Cards = cards, Carried = hdu, DataBytes = hdu.DataBytes };
            }
            else
            {
                yield return new OutputHdu { Label = hdu.Label, Carried = hdu, HeaderBytes = hdu.DataOffset - hdu.HeaderOffset, DataBytes = hdu.DataBytes };
            }
        }
    }

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
            List<FitsCard> cards = NewHeader.Primary(axes, first, firstType);
            HeaderEdit.MakePrimary(cards, request.Created);
            yield return Frames("primary", cards, axes, 0, source.FrameCount, firstType);
            yield break;
        }

        List<FitsCard> empty = NewHeader.EmptyPrimary();
        HeaderEdit.MakePrimary(empty, request.Created);
        yield return new OutputHdu { Label = "primary", Cards = empty };
        for (int i = 0; i < source.FrameCount; i++)
        {
            FrameLayout layout = source.Layout(i);
            IReadOnlyList<long> axes = [layout.Width, layout.Height];
            SampleType type = request.SampleTypeOf(i);
            yield return Frames(string.Create(CultureInfo.InvariantCulture, $"{NewHeader.ExtensionName},{i + 1}"), NewHeader.Extension(axes, layout, type, i + 1), axes, i, 1, type);
        }
    }

    private static OutputHdu Frames(string label, List<FitsCard> cards, IReadOnlyList<long> axes, int first, int count, SampleType type) => new()
    {
        Label = label,
        Cards = cards,
        FirstFrame = first,
        Frames = count,
        Axes = axes,
        SampleType = type,
        DataBytes = axes.Aggregate(1L, (product, axis) => product * axis) * type.Size(),
    };

    /// <summary>Gives each HDU its place, one behind the other.</summary>
    private static List<OutputHdu> Place(IEnumerable<OutputHdu> hdus)
    {
        List<OutputHdu> placed = [];
        long offset = 0;
        foreach (OutputHdu hdu in hdus)
        {
            long header = hdu.Cards is { } cards ? HeaderImage.BytesFor(cards.Count + (placed.Count == 0 ? Reserve : 0)) : hdu.HeaderBytes;
            placed.Add(hdu with { Offset = offset, HeaderBytes = header });
            offset = placed[^1].End;
        }

        return placed;
    }

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
