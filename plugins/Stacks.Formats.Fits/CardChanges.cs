namespace Stacks.Formats.Fits;

/// <summary>A group of cards that may differ between a source's header and its result's.</summary>
/// <param name="Keywords">Their keywords; <c>NAXISn</c> stands for NAXIS1, NAXIS2 and so on.</param>
/// <param name="When">In which headers.</param>
/// <param name="What">What becomes of them.</param>
internal sealed record CardChange(IReadOnlyList<string> Keywords, string When, string What);

/// <summary>
/// The whole list of cards that may differ between input and output. Every other card of a header with frames goes on card
/// for card, all 80 characters of it, in its order; headers without frames go on byte for byte but for the primary's.
/// </summary>
internal static class CardChanges
{
    /// <summary>Cards that describe samples as a whole, and are made anew or left out.</summary>
    public static CardChange Checksums { get; } = new(["CHECKSUM", "DATASUM"], "with frames, and the primary", "made anew");

    /// <summary>Extremes, which nothing keeps true.</summary>
    public static CardChange Extremes { get; } = new(["DATAMIN", "DATAMAX"], "with frames, and the primary", "left out");

    /// <summary>How stored samples become values.</summary>
    public static CardChange Scaling { get; } = new(["BITPIX", "BZERO", "BSCALE", "BLANK"], "with frames whose sample type changes", "those of the new type");

    /// <summary>The size of the array.</summary>
    public static CardChange Axes { get; } = new(["NAXIS", "NAXISn"], "with frames of which some are missing (`--salvage`)", "those of the frames that are there");

    /// <summary>The time of making.</summary>
    public static CardChange Date { get; } = new(["DATE"], "the primary", "the time of making");

    /// <summary>Whether extensions follow.</summary>
    public static CardChange Extend { get; } = new(["EXTEND"], "the primary", "T: the ledger follows");

    /// <summary>What this program adds; a later run replaces it.</summary>
    public static CardChange Provenance { get; } = new([.. ProvenanceCards.Keywords, "LONGSTRN"], "the primary", "added, behind the source's cards; a later run replaces them");

    /// <summary>The commentary this program adds.</summary>
    public static CardChange History { get; } = new(["HISTORY"], "the primary", "added, behind all others; the source's own stay in their places");

    /// <summary>Blank cards at the end of a header, which only fill it.</summary>
    public static CardChange Filling { get; } = new([""], "all", "left out where nothing follows them");

    /// <summary>All of them.</summary>
    public static IReadOnlyList<CardChange> Declared { get; } = [Checksums, Extremes, Scaling, Axes, Date, Extend, Provenance, History, Filling];
}
