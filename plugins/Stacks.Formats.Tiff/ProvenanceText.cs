using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// The provenance as named texts, for XMP properties and elements of an OME annotation alike (namespace
/// <c>urn:stacks:provenance:1</c>).
/// </summary>
internal static class ProvenanceText
{
    /// <summary>Namespace of the names.</summary>
    public const string Namespace = "urn:stacks:provenance:1";

    /// <summary>Columns of a ledger line.</summary>
    public const string LedgerColumns =
        "frame source_sha256 result_sha256 level noise_before noise_after replaced_bright replaced_dark kept_as_source saturated missing flux_in flux_removed flux_out flags";

    /// <summary>Everything, in order; names that may have several values have a list.</summary>
    public static IEnumerable<(string Name, bool IsList, IReadOnlyList<string> Values)> All(ProvenanceRecord record, IReadOnlyList<LedgerRow> ledger)
    {
        RunTotals totals = record.Totals;
        yield return One("Program", record.Program);
        yield return One("Version", record.Version);
        yield return One("Created", Time(record.Created));
        yield return One("RecipeTitle", record.RecipeTitle);
        yield return One("RecipeSha256", record.RecipeDigest);
        yield return One("WorkSha256", record.WorkDigest);
        yield return One("SourceName", record.SourceName);
        yield return One("SourceSha256", record.SourceDigest);
        yield return ("Step", true, [.. record.Steps.Select(Step)]);
        yield return ("Noise", true, record.Noise);
        yield return One("Frames", Number(totals.Frames));
        yield return One("ReplacedBright", Number(totals.ReplacedBright));
        yield return One("ReplacedDark", Number(totals.ReplacedDark));
        yield return One("KeptAsSource", Number(totals.KeptAsSource));
        yield return One("Saturated", Number(totals.Saturated));
        yield return One("Missing", Number(totals.Missing));
        yield return One("FluxIn", Number(totals.FluxIn));
        yield return One("FluxRemoved", Number(totals.FluxRemoved));
        yield return One("FluxOut", Number(totals.FluxOut));
        yield return ("Remark", true, record.Remarks);
        yield return One("Ledger", string.Join('\n', ledger.Select(Line).Prepend(LedgerColumns)));
    }

    /// <summary>Resolved parameters of a step: <c>threshold = 5 sigma; largest_window = 7 px</c>.</summary>
    public static string Parameters(ProvenanceStep step) =>
        string.Join("; ", step.Parameters.Select(p => $"{p.Name} = {p.Value} {p.Unit}".TrimEnd()));

    /// <summary>UTC, ISO 8601, to the second.</summary>
    public static string Time(DateTimeOffset time) => time.UtcDateTime.ToString("yyyy-MM-dd'T'HH:mm:ss'Z'", CultureInfo.InvariantCulture);

    private static string Step(ProvenanceStep step) =>
        $"{step.Filter}{(step.Channel is null ? "" : $" on channel {step.Channel}")} ({step.Plugin} {step.Version}, sha256 {step.PluginDigest}): {Parameters(step)}";

    private static string Line(LedgerRow row) => string.Join(
        ' ',
        Number(row.Frame),
        Convert.ToHexStringLower(row.SourceDigest),
        Convert.ToHexStringLower(row.ResultDigest),
        Number(row.Level),
        Number(row.NoiseBefore),
        Number(row.NoiseAfter),
        Number(row.ReplacedBright),
        Number(row.ReplacedDark),
        Number(row.KeptAsSource),
        Number(row.Saturated),
        Number(row.Missing),
        Number(row.FluxIn),
        Number(row.FluxRemoved),
        Number(row.FluxOut),
        Number((int)row.Flags));

    private static (string Name, bool IsList, IReadOnlyList<string> Values) One(string name, string value) => (name, false, [value]);

    private static string Number(long number) => number.ToString(CultureInfo.InvariantCulture);

    private static string Number(double number) => number.ToString("R", CultureInfo.InvariantCulture);
}
