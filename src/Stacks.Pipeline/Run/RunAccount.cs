using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Gathers, frame after frame in order, what the provenance tells of a run.</summary>
internal sealed class RunAccount(RunPlan plan)
{
    private readonly List<LedgerRow> ledger = [];
    private readonly List<PreparedFrame> kinds = [];
    private readonly List<string> noiseLines = [];
    private readonly List<string> warnings = [];
    private ProvenanceRecord? provenance;

    /// <summary>A row per frame.</summary>
    public IReadOnlyList<LedgerRow> Ledger => ledger;

    /// <summary>Sentences for the user.</summary>
    public IReadOnlyList<string> Warnings => warnings;

    /// <summary>The record, after <see cref="Finish"/>.</summary>
    public ProvenanceRecord Provenance => provenance ?? throw new InvalidOperationException("the run has not ended");

    /// <summary>Adds a frame.</summary>
    public void Add(FrameAccount frame)
    {
        ledger.Add(frame.Row);
        if (!kinds.Contains(frame.Prepared))
            kinds.Add(frame.Prepared);
        if (frame.Noise is { } noise)
        {
            string line = $"{noise.Origin}: {noise.Model.Describe()}";
            if (!noiseLines.Contains(line))
                noiseLines.Add(line);
        }
    }

    /// <summary>Makes the record.</summary>
    public void Finish(string sourceDigest, string workDigest, DateTimeOffset created) => provenance = new ProvenanceRecord
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
        Noise = noiseLines,
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
        Remarks = [.. warnings],
    };

    /// <summary>A step as it took effect; a parameter that resolved differently for different frames shows each value.</summary>
    private ProvenanceStep Step(PlannedStep planned, int number)
    {
        IEnumerable<ResolvedParameter> resolved = kinds
            .SelectMany(k => k.Parts)
            .SelectMany(p => p.Steps)
            .Where(s => s.Number == number)
            .SelectMany(s => s.Step.Resolved);
        PluginOrigin origin = planned.Filter.Origin;
        return new ProvenanceStep(
            planned.Section.Filter,
            origin.Assembly,
            origin.Version,
            origin.Digest,
            planned.Section.Channel,
            [.. resolved.GroupBy(r => (r.Name, r.Unit)).Select(g => new ResolvedParameter(
                g.Key.Name, string.Join(" | ", g.Select(r => r.Value).Distinct()), g.Key.Unit))]);
    }
}
