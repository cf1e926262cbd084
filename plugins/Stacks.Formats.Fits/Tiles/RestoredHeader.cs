using System.Globalization;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// The header of the image that was compressed, from the header of its table (Standard 4.0, section 10.1): the keywords of
/// the table are taken out, the mandatory keywords of the image come back under their own names and in their order, and
/// every other card stands verbatim and in its order.
/// </summary>
internal static class RestoredHeader
{
    /// <summary>The EXTNAME that programs give to an image without one (common practice).</summary>
    public const string NoName = "COMPRESSED_IMAGE";

    /// <summary>Keywords of the table and of the compression.</summary>
    private static readonly string[] OfTable =
    [
        "XTENSION", "BITPIX", "NAXIS", "NAXIS1", "NAXIS2", "PCOUNT", "GCOUNT", "TFIELDS", "THEAP", "CHECKSUM", "DATASUM",
        "ZIMAGE", "ZCMPTYPE", "ZQUANTIZ", "ZDITHER0", "ZMASKCMP", "ZSCALE", "ZZERO",
    ];

    /// <summary>Keywords of a column, with its number.</summary>
    private static readonly string[] OfColumns = ["TTYPE", "TFORM", "TUNIT", "TNULL", "TSCAL", "TZERO", "TDISP", "TDIM"];

    /// <summary>Keywords of the compression, with a number.</summary>
    private static readonly string[] OfTiles = ["ZTILE", "ZNAME", "ZVAL"];

    /// <summary>The original keywords that hold for a primary array alone.</summary>
    private static readonly string[] OfPrimary = ["EXTEND", "BLOCKED"];

    /// <summary>What a primary header without data cannot do without.</summary>
    private static readonly string[] OfBarePrimary = ["SIMPLE", "BITPIX", "NAXIS", "EXTEND", "CHECKSUM", "DATASUM"];

    /// <summary>Original keywords that keep their place among the others, under the names that keep them in the table.</summary>
    private static readonly (string Kept, string Original)[] Renamed =
        [("ZEXTEND", "EXTEND"), ("ZBLOCKED", "BLOCKED"), ("ZHECKSUM", "CHECKSUM"), ("ZDATASUM", "DATASUM")];

    /// <summary>The image's header.</summary>
    /// <param name="table">The header as it stands in the file.</param>
    /// <param name="asPrimary">True when the image becomes the primary array.</param>
    public static FitsHeader Of(FitsHeader table, bool asPrimary)
    {
        List<FitsCard> first = [], others = [];
        FitsCard? Original(string kept, string keyword) => table.Own(kept) is { } card ? Rename(card, keyword) : null;

        long axes = table.OwnInteger("ZNAXIS") ?? 0;
        first.Add(asPrimary
            ? Original("ZSIMPLE", "SIMPLE") ?? FitsCard.Logical("SIMPLE", true, "")
            : Original("ZTENSION", "XTENSION") ?? FitsCard.Text("XTENSION", "IMAGE", "image extension").Single());
        first.Add(Rename(table.Own("ZBITPIX")!.Value, "BITPIX"));
        first.Add(Rename(table.Own("ZNAXIS")!.Value, "NAXIS"));
        for (long i = 1; i <= axes; i++)
            first.Add(Rename(table.Own(string.Create(CultureInfo.InvariantCulture, $"ZNAXIS{i}"))!.Value, string.Create(CultureInfo.InvariantCulture, $"NAXIS{i}")));
        if (!asPrimary)
        {
            first.Add(Original("ZPCOUNT", "PCOUNT") ?? FitsCard.Integer("PCOUNT", 0, ""));
            first.Add(Original("ZGCOUNT", "GCOUNT") ?? FitsCard.Integer("GCOUNT", 1, ""));
        }

        // Integers that are missing have BLANK; some programs call it ZBLANK, which the standard keeps for quantised floats.
        bool isBlankRenamed = table.OwnInteger("ZBITPIX") > 0 && table.Own("BLANK") is null;
        long columns = table.OwnInteger("TFIELDS") ?? 0;
        bool isDropped = false;
        foreach (FitsCard card in table.Cards)
        {
            if (isDropped && card.Is("CONTINUE"))
                continue;
            FitsCard? kept = card.HasValue ? Keep(card, columns, asPrimary, isBlankRenamed) : card;
            isDropped = kept is null;
            if (kept is { } other)
                others.Add(other);
        }

        return new FitsHeader(table.Where, [.. first, .. others], table.Bytes);
    }

    /// <summary>
    /// True when a primary header says nothing of its own, so that it is the one that compression puts before an image that
    /// was the primary array: mandatory keywords, and comments that stand in the image's header too or are of no meaning.
    /// </summary>
    public static bool IsBare(FitsHeader primary, FitsHeader table)
    {
        HashSet<FitsCard> others = [.. table.Cards];
        return primary.OwnInteger("NAXIS") == 0 && primary.Cards.All(card =>
            card == FitsCard.Blank
            || OfBarePrimary.Any(card.Is)
            || TileHeader.OfBarePrimary.Any(text => card.Image.StartsWith(text, StringComparison.Ordinal))
            || others.Contains(card));
    }

    private static FitsCard? Keep(FitsCard card, long columns, bool asPrimary, bool isBlankRenamed)
    {
        string keyword = card.Keyword;
        foreach ((string kept, string original) in Renamed)
        {
            if (keyword == kept)
                return asPrimary || !OfPrimary.Contains(original) ? Rename(card, original) : null;
        }

        if (asPrimary && keyword is "ZPCOUNT" or "ZGCOUNT")
            return Rename(card, keyword[1..]);
        if (keyword == "ZBLANK")
            return isBlankRenamed ? Rename(card, "BLANK") : null;
        bool isOfTable = OfTable.Contains(keyword)
            || keyword is "ZSIMPLE" or "ZTENSION" or "ZBITPIX" or "ZNAXIS" or "ZPCOUNT" or "ZGCOUNT"
            || (keyword == "EXTNAME" && card.Value.Trim() == NoName)
            || Numbered(keyword, OfColumns) is { } column && column <= columns
            || Numbered(keyword, OfTiles) is not null
            || Numbered(keyword, ["ZNAXIS"]) is not null;
        return isOfTable ? null : card;
    }

    /// <summary>The number behind one of some words; null when the keyword is none of them.</summary>
    private static int? Numbered(string keyword, ReadOnlySpan<string> words)
    {
        foreach (string word in words)
        {
            if (keyword.StartsWith(word, StringComparison.Ordinal) && int.TryParse(keyword.AsSpan(word.Length), NumberStyles.None, CultureInfo.InvariantCulture, out int number))
                return number;
        }

        return null;
    }

    private static FitsCard Rename(FitsCard card, string keyword) => new(keyword.PadRight(8) + card.Image[8..]);
}
