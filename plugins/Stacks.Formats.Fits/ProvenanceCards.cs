using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// The provenance in the primary header: keywords for the latest run, which a later one replaces, and HISTORY for this
/// and all earlier ones.
/// </summary>
internal static class ProvenanceCards
{
    /// <summary>The keywords that a later run replaces.</summary>
    public static IReadOnlyList<string> Keywords { get; } =
    [
        "STKPROG", "STKTITLE", "STKRECIP", "STKWORK", "STKSRC", "STKSRCSH", "STKFRAME", "STKBRITE", "STKDARK", "STKKEPT",
        "STKSATUR", "STKMISS", "STKFLXIN", "STKFLXRM", "STKFLXOT",
    ];

    /// <summary>The cards of a run; where they need more than <paramref name="room"/>, the last says what is left out.</summary>
    /// <param name="record">Who did what to which data.</param>
    /// <param name="notes">Further lines for HISTORY.</param>
    /// <param name="longStrings">True when the header announces CONTINUE by LONGSTRN already.</param>
    /// <param name="room">Cards that the header has left.</param>
    public static IReadOnlyList<FitsCard> Of(ProvenanceRecord record, IEnumerable<string> notes, bool longStrings, int room)
    {
        List<FitsCard> cards =
        [
            .. FitsCard.Text("STKPROG", $"{record.Program} {record.Version}", "program that made these samples"),
            .. record.RecipeTitle.Length == 0 ? [] : FitsCard.Text("STKTITLE", record.RecipeTitle, ""),
            .. FitsCard.Text("STKRECIP", record.RecipeDigest, ""),
            .. FitsCard.Text("STKWORK", record.WorkDigest, ""),
            .. FitsCard.Text("STKSRC", record.SourceName, "source file"),
            .. FitsCard.Text("STKSRCSH", record.SourceDigest, ""),
            FitsCard.Integer("STKFRAME", record.Totals.Frames, "frames"),
            FitsCard.Integer("STKBRITE", record.Totals.ReplacedBright, "pixels replaced, brighter than around"),
            FitsCard.Integer("STKDARK", record.Totals.ReplacedDark, "pixels replaced, darker than around"),
            FitsCard.Integer("STKKEPT", record.Totals.KeptAsSource, "candidates kept as sources"),
            FitsCard.Integer("STKSATUR", record.Totals.Saturated, "saturated samples"),
            FitsCard.Integer("STKMISS", record.Totals.Missing, "missing samples"),
            FitsCard.Number("STKFLXIN", record.Totals.FluxIn, "sum of valid input values"),
            FitsCard.Number("STKFLXRM", record.Totals.FluxRemoved, "sum of input minus output"),
            FitsCard.Number("STKFLXOT", record.Totals.FluxOut, "sum of valid output values"),
            .. History(record, notes).SelectMany(line => FitsCard.Commentary("HISTORY", line)),
        ];
        if (!longStrings && cards.Any(card => card.Is("CONTINUE")))
            cards.InsertRange(0, FitsCard.Text("LONGSTRN", "OGIP 1.0", "long strings go on in CONTINUE"));
        if (cards.Count <= room)
            return cards;
        cards.RemoveRange(room - 1, cards.Count - room + 1);
        return [.. cards, .. FitsCard.Commentary("HISTORY", " The header is full; the rest stands in the .prov.json beside it.")];
    }

    /// <summary>The run in words, a line for each fact.</summary>
    private static IEnumerable<string> History(ProvenanceRecord record, IEnumerable<string> notes)
    {
        // A later run replaces the keywords, so that HISTORY holds the digests in full; they just fit a card.
        yield return $"{record.Program} {record.Version}, {HeaderEdit.Stamp(record.Created)} UTC; digests are SHA-256";
        yield return $" source {record.SourceName}";
        yield return $" source {record.SourceDigest}";
        yield return $" recipe {record.RecipeDigest}";
        yield return $" work   {record.WorkDigest}";
        for (int i = 0; i < record.Steps.Count; i++)
        {
            ProvenanceStep step = record.Steps[i];
            string channel = step.Channel is null ? "" : $" on channel {step.Channel}";
            yield return string.Create(CultureInfo.InvariantCulture, $" step {i + 1}: {step.Filter}{channel}, {step.Plugin} {step.Version} {Short(step.PluginDigest)}");
            foreach (ResolvedParameter parameter in step.Parameters)
                yield return $"   {parameter.Name} = {parameter.Value} {parameter.Unit}".TrimEnd();
        }

        if (record.Steps.Count == 0)
            yield return " no steps: samples are the source's";
        foreach (string line in record.Noise)
            yield return $" noise: {line}";
        foreach (string line in record.Remarks.Concat(notes))
            yield return $" note: {line}";
    }

    private static string Short(string digest) => digest.Length > 16 ? digest[..16] : digest;
}
