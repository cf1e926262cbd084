using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Gathers, frame after frame in order, what the provenance tells of a run.</summary>
internal sealed class RunAccount(RunPlan plan)
{
    private readonly List<LedgerRow> ledger = [];
    private readonly List<PreparedFrame> kinds = [];
    private readonly NoiseAccount noise = new();
    private readonly SortedDictionary<(int Step, string Name), (double Least, double Most)> figures = [];
    private ProvenanceRecord? provenance;

    /// <summary>A row per frame.</summary>
    public IReadOnlyList<LedgerRow> Ledger => ledger;

    /// <summary>Sentences for the user, after <see cref="Finish"/>.</summary>
    public IReadOnlyList<string> Warnings { get; private set; } = [];

    /// <summary>The record, after <see cref="Finish"/>.</summary>
    public ProvenanceRecord Provenance => provenance ?? throw new InvalidOperationException("the run has not ended");

    /// <summary>Adds a frame.</summary>
    public void Add(FrameAccount frame)
    {
        ledger.Add(frame.Row);
        noise.Add(frame);
        if (!kinds.Contains(frame.Prepared))
            kinds.Add(frame.Prepared);
        foreach (StepFigure figure in frame.Figures ?? [])
        {
            (int, string) key = (figure.Step, figure.Name);
            (double least, double most) = figures.GetValueOrDefault(key, (figure.Value, figure.Value));
            figures[key] = (Math.Min(least, figure.Value), Math.Max(most, figure.Value));
        }
    }

    /// <summary>Makes the record.</summary>
    public void Finish(string sourceDigest, string workDigest, DateTimeOffset created, IReadOnlyList<string> damage)
    {
        Warnings = [.. plan.Reader.Losses.Select(loss => "salvaged: " + loss), .. damage, .. noise.Warnings(ledger.Count), .. FrameWarnings(), .. StepWarnings(), .. FormatWarnings()];
        provenance = new ProvenanceRecord
        {
            Program = Software.Name,
            Version = Software.Version,
            Created = created,
            RecipeTitle = plan.Recipe.Title,
            RecipeDigest = plan.RecipeDigest,
            WorkDigest = workDigest,
            SourceName = Path.GetFileName(plan.Reader.Path),
            SourceDigest = sourceDigest,
            Steps = [.. plan.Steps.Select((planned, i) => Step(planned, i + 1))],
            Noise = noise.Lines(),
            Totals = new RunTotals(
                ledger.Count,
                ledger.Sum(r => r.ReplacedBright),
                ledger.Sum(r => r.ReplacedDark),
                ledger.Sum(r => r.KeptAsSource),
                ledger.Sum(r => r.Saturated),
                ledger.Sum(r => r.Missing),
                ledger.Sum(r => r.FluxIn),
                ledger.Sum(r => r.FluxRemoved),
                ledger.Sum(r => r.FluxOut)),
            Remarks = [.. SmoothingRemarks(), .. Warnings],
        };
        if (LeftOut.Sentence(plan) is { } leftOut)
            Warnings = [.. Warnings, leftOut]; // the writers name each part in the result
    }

    /// <summary>A step as it took effect; a parameter that resolved differently for different frames shows each value.</summary>
    private ProvenanceStep Step(PlannedStep planned, int number)
    {
        ResolvedParameter[] resolved =
        [
            .. Applied(number)
                .SelectMany(s => s.Step.Resolved)
                .GroupBy(r => (r.Name, r.Unit))
                .Select(g => new ResolvedParameter(g.Key.Name, string.Join(" | ", g.Select(r => r.Value).Distinct()), g.Key.Unit)),
        ];
        IEnumerable<ResolvedParameter> measured = figures
            .Where(f => f.Key.Step == number)
            .Select(f => (f.Key.Name, Value: Range(f.Value.Least, f.Value.Most)))
            .Where(f => !resolved.Any(r => r.Name == f.Name && r.Value == f.Value))
            .Select(f => new ResolvedParameter(
                f.Name + " on the frames", f.Value, planned.Filter.Plugin.Parameters.FirstOrDefault(p => p.Name == f.Name)?.Unit ?? ""));
        PluginOrigin origin = planned.Filter.Origin;
        return new ProvenanceStep(
            planned.Section.Filter, origin.Assembly, origin.Version, origin.Digest, planned.Section.Channel, [.. resolved, .. measured]);
    }

    private static string Range(double least, double most) => least == most
        ? least.ToString("G6", CultureInfo.InvariantCulture)
        : string.Create(CultureInfo.InvariantCulture, $"{least:G6} to {most:G6}");

    private IEnumerable<PreparedStep> Applied(int number) =>
        kinds.SelectMany(k => k.Parts).SelectMany(p => p.Steps).Where(s => s.Number == number);

    private IEnumerable<string> FrameWarnings()
    {
        LedgerRow[] held = [.. ledger.Where(r => r.Flags.HasFlag(LedgerFlags.OutOfRange))];
        if (held.Length > 0)
        {
            yield return string.Create(
                CultureInfo.InvariantCulture,
                $"frame {held[0].Frame}: results beyond the output type's range were held at its end (so in {held.Length} of {ledger.Count} frames); write float32 or float64 samples");
        }
    }

    private IEnumerable<string> StepWarnings()
    {
        if (plan.Recipe.Input.Defects is not null && !plan.Steps.Any(s => s.Filter.Plugin.Kind == FilterKind.Selective))
            yield return "defects are given, but no step is selective: none is replaced";
    }

    private IEnumerable<string> FormatWarnings()
    {
        if (plan.Reader.Format.Id != plan.OutputFormat.Id)
            yield return $"keywords and tags of the source's headers do not go into another format: they stand in {Path.GetFileName(plan.Reader.Path)} alone";
    }

    private IEnumerable<string> SmoothingRemarks()
    {
        if (!kinds.Any(k => k.IsSmoothed))
            yield break;
        yield return "Smoothed: gain and read noise of the header no longer give the errors of single pixels, and neighbours are correlated.";
        yield return "Smoothing moves flux inside its kernel: sums over sources change, also where the frame's total is kept.";
    }
}
