using System.Globalization;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// The header of a table of tiles, from the header of the image that they hold (Standard 4.0, section 10.1); what
/// <see cref="RestoredHeader"/> undoes.
/// </summary>
internal static class TileHeader
{
    private static readonly string[] Mandatory = ["SIMPLE", "BITPIX", "NAXIS", "EXTEND", "BLOCKED", "PCOUNT", "GCOUNT"];

    /// <summary>
    /// How cards begin that mean nothing in a primary header without data: programs put the first two into every primary
    /// header, and this one the third before an image that was the primary array.
    /// </summary>
    public static IReadOnlyList<string> OfBarePrimary { get; } =
    [
        "COMMENT   FITS (Flexible Image Transport System) format is",
        "COMMENT   and Astrophysics', volume 376",
        "COMMENT " + Pointer,
    ];

    private const string Pointer = "The primary array and its header, with the provenance, follow in tiles.";

    /// <summary>The primary header before an image that was the primary array.</summary>
    public static List<FitsCard> BarePrimary() =>
    [
        .. NewHeader.EmptyPrimary(),
        FitsCard.Logical("EXTEND", true, "extensions may follow"),
        .. FitsCard.Commentary("COMMENT", Pointer),
    ];

    /// <summary>The table's cards. There are as many of them whatever becomes of the tiles.</summary>
    /// <param name="image">The image's cards.</param>
    /// <param name="plan">How it is cut and compressed.</param>
    /// <param name="heapBytes">Bytes of all tiles.</param>
    /// <param name="longest">Bytes of the longest tile.</param>
    public static List<FitsCard> Of(IReadOnlyList<FitsCard> image, TilePlan plan, long heapBytes, int longest)
    {
        static string Numbered(string word, int number) => string.Create(CultureInfo.InvariantCulture, $"{word}{number}");
        List<FitsCard> cards =
        [
            .. FitsCard.Text("XTENSION", "BINTABLE", "an image in compressed tiles"),
            FitsCard.Integer("BITPIX", 8, ""),
            FitsCard.Integer("NAXIS", 2, ""),
            FitsCard.Integer("NAXIS1", plan.DescriptorBytes, "bytes of a row"),
            FitsCard.Integer("NAXIS2", plan.Grid.Tiles, "tiles"),
            FitsCard.Integer("PCOUNT", heapBytes, "bytes of the tiles"),
            FitsCard.Integer("GCOUNT", 1, ""),
            FitsCard.Integer("TFIELDS", 1, ""),
            .. FitsCard.Text("TTYPE1", "COMPRESSED_DATA", ""),
            .. FitsCard.Text("TFORM1", string.Create(CultureInfo.InvariantCulture, $"1{plan.DescriptorType}B({longest})"), ""),
            FitsCard.Logical("ZIMAGE", true, "an image in compressed tiles"),
            .. plan.TileAxes.Select((axis, i) => FitsCard.Integer(Numbered("ZTILE", i + 1), axis, i < 2 ? "" : "a tile never spans frames")),
            .. FitsCard.Text("ZCMPTYPE", plan.Name, "compression without loss"),
        ];
        for (int i = 0; i < plan.Settings.Count; i++)
        {
            cards.AddRange(FitsCard.Text(Numbered("ZNAME", i + 1), plan.Settings[i].Name, ""));
            cards.Add(FitsCard.Integer(Numbered("ZVAL", i + 1), plan.Settings[i].Value, plan.Settings[i].Meaning));
        }

        if (plan.IsFloat)
            cards.AddRange(FitsCard.Text("ZQUANTIZ", "NONE", "samples are kept to the bit"));
        cards.AddRange(image.Select(Kept));
        return cards;
    }

    /// <summary>A card under the name that keeps it in the table.</summary>
    private static FitsCard Kept(FitsCard card)
    {
        if (card.Is("XTENSION"))
            return new FitsCard("ZTENSION" + card.Image[8..]);
        string keyword = card.Keyword;
        bool isMandatory = Mandatory.Contains(keyword)
            || (keyword.StartsWith("NAXIS", StringComparison.Ordinal) && keyword.AsSpan(5).ContainsAnyExceptInRange('0', '9') == false);
        return isMandatory ? new FitsCard(("Z" + keyword).PadRight(8) + card.Image[8..]) : card;
    }
}
