using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// The source's header as it goes on: every card verbatim and in its order, but for those of <see cref="CardChanges"/>.
/// </summary>
internal static class HeaderEdit
{
    private static readonly string[] NeverCarried = [.. CardChanges.Checksums.Keywords, .. CardChanges.Extremes.Keywords];

    /// <summary>The cards of a header over frames.</summary>
    /// <param name="source">The source's header.</param>
    /// <param name="hdu">The source's HDU.</param>
    /// <param name="axes">Axes that are written; they differ from the source's when that is truncated.</param>
    /// <param name="type">Type that is written.</param>
    public static List<FitsCard> OverFrames(FitsHeader source, Hdu hdu, IReadOnlyList<long> axes, SampleType type)
    {
        List<FitsCard> cards = [.. Carried(source)];
        if (!axes.SequenceEqual(hdu.Axes))
            ReplaceAxes(cards, axes);
        if (type == hdu.Layout!.SampleType)
            return cards;

        cards.RemoveAll(card => CardChanges.Scaling.Keywords.Any(card.Is) && !card.Is("BITPIX"));
        Replace(cards, FitsCard.Integer("BITPIX", SampleEncoding.BitPix(type), ""));
        if (SampleEncoding.Shift(type) != 0)
            cards.InsertRange(AfterAxes(cards), Shift(type));
        return cards;
    }

    /// <summary>The cards of a primary header: DATE is made anew, and EXTEND announces the extensions that follow.</summary>
    public static List<FitsCard> AsPrimary(List<FitsCard> cards, DateTimeOffset created)
    {
        FitsCard date = FitsCard.Text("DATE", Stamp(created), "UTC time of making").Single();
        if (!Replace(cards, date))
            cards.Add(date);
        if (!cards.Any(card => card.Is("EXTEND") && card.Value == "T") && !Replace(cards, FitsCard.Logical("EXTEND", true, "")))
            cards.Insert(AfterAxes(cards), FitsCard.Logical("EXTEND", true, "extensions may follow"));
        return cards;
    }

    /// <summary>
    /// The cards that hold whatever becomes of the samples: without checksums and extremes, without the keywords of an
    /// earlier pass of this program (their HISTORY stays), and without blank cards at the end.
    /// </summary>
    public static IEnumerable<FitsCard> Carried(FitsHeader source)
    {
        int count = source.Cards.Count;
        while (count > 0 && source.Cards[count - 1] == FitsCard.Blank)
            count--;
        bool isDropped = false;
        foreach (FitsCard card in source.Cards.Take(count))
        {
            if (!(isDropped && card.Is("CONTINUE")))
                isDropped = NeverCarried.Any(card.Is) || ProvenanceCards.Keywords.Any(card.Is);
            if (!isDropped)
                yield return card;
        }
    }

    /// <summary>BSCALE and BZERO of a type that FITS knows only by its sign convention.</summary>
    public static IEnumerable<FitsCard> Shift(SampleType type) =>
    [
        FitsCard.Integer("BSCALE", 1, ""),
        FitsCard.Integer("BZERO", SampleEncoding.Shift(type), $"samples are {type.Name()}"),
    ];

    /// <summary>UTC, ISO 8601, without Z (Standard 4.0, section 9.1.1).</summary>
    public static string Stamp(DateTimeOffset time) => time.UtcDateTime.ToString("yyyy-MM-dd'T'HH:mm:ss", CultureInfo.InvariantCulture);

    private static void ReplaceAxes(List<FitsCard> cards, IReadOnlyList<long> axes)
    {
        int at = cards.FindIndex(card => card.Is("NAXIS"));
        cards.RemoveAll(card => card.Is("NAXIS") || (card.Keyword.StartsWith("NAXIS", StringComparison.Ordinal) && card.Keyword[5..].All(char.IsAsciiDigit)));
        cards.Insert(at, FitsCard.Integer("NAXIS", axes.Count, ""));
        cards.InsertRange(at + 1, axes.Select((axis, i) => FitsCard.Integer(string.Create(CultureInfo.InvariantCulture, $"NAXIS{i + 1}"), axis, "")));
    }

    /// <summary>Puts a new value in the place of the first card with its keyword and keeps that card's comment.</summary>
    private static bool Replace(List<FitsCard> cards, FitsCard card)
    {
        int at = cards.FindIndex(c => c.Is(card.Keyword));
        if (at >= 0)
            cards[at] = card.WithComment(cards[at].Comment);
        return at >= 0;
    }

    private static int AfterAxes(List<FitsCard> cards) => cards.FindLastIndex(card => card.Is("GCOUNT") || card.Keyword.StartsWith("NAXIS", StringComparison.Ordinal)) + 1;
}
