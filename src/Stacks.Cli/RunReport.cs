using System.Globalization;
using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>What <c>run</c> prints at its end: what was done to each stack, in a practitioner's terms.</summary>
internal static class RunReport
{
    /// <summary>For people. A single stack that failed has had its line on stderr, and gets no report.</summary>
    public static void WriteText(IReadOnlyList<NightEntry> entries)
    {
        foreach (NightEntry entry in entries.Where(e => e.Result is { Outcome: RunOutcome.PartOfAnother }))
            Console.WriteLine($"{entry.Item.Input}: {entry.Result!.Warnings[0]}");
        foreach (NightEntry entry in entries.Where(e => e is { Plan: not null, Result: not null }))
            WriteText(entry, entry.Plan!, entry.Result!);
        if (entries.Count > 1)
            WriteSummary(entries);
        if (entries.Any(e => e.Result is { Outcome: RunOutcome.Made }))
            Console.WriteLine("For research, not for diagnosis. Keep the raw data.");
    }

    /// <summary>For machines.</summary>
    public static void WriteJson(IReadOnlyList<NightEntry> entries, int exitCode) => JsonText.Write(new
    {
        ExitCode = exitCode,
        Made = entries.Count(e => e.Result is { Outcome: RunOutcome.Made }),
        DoneBefore = entries.Count(e => e.Result is { Outcome: RunOutcome.AlreadyDone }),
        Failed = entries.Count(e => e.Fault is not null),
        Stacks = entries.Select(e => new
        {
            e.Item.Input,
            Output = e.Item.Output.Length > 0 ? e.Item.Output : null,
            e.ExitCode,
            Error = e.Fault is null ? null : ErrorLine.Text(e.Fault),
            Outcome = e.Result?.Outcome switch { RunOutcome.Made => "made", RunOutcome.AlreadyDone => "done_before", RunOutcome.PartOfAnother => "part_of_another", _ => "failed" },
            Seconds = e.Elapsed.TotalSeconds,
            Files = e.Result?.Files,
            Warnings = e.Result?.Warnings,
            Pixels = e.Plan?.Kinds.Sum(k => k.Count * k.Layout.Length),
            Unit = e.Plan is null ? null : UnitOf(e.Plan),
            Totals = e.Result?.Provenance?.Totals,
            NoiseBefore = Median(e.Result, r => r.NoiseBefore),
            NoiseAfter = Median(e.Result, r => r.NoiseAfter),
            RecipeSha256 = e.Plan?.RecipeDigest,
            WorkSha256 = e.Result?.Provenance?.WorkDigest,
        }),
    });

    private static void WriteText(NightEntry entry, RunPlan plan, RunResult result)
    {
        string shapes = string.Join(" | ", plan.Kinds.Select(k => Describe.Shape(k.Layout)).Distinct());
        Console.WriteLine($"{entry.Item.Input}: {Describe.Frames(plan.Kinds.Sum(k => k.Count))} of {shapes}");
        if (result.Outcome == RunOutcome.AlreadyDone)
        {
            Line("done", $"before, by the same recipe and plugins: {entry.Item.Output} is left as it is");
            return;
        }

        if (result.Provenance?.Totals is { } totals)
            WriteTotals(plan, result, totals);
        foreach (string note in Notes(plan))
            Line("note", note);
        foreach (string warning in result.Warnings)
            Line("warning", warning);
        for (int i = 0; i < result.Files.Count; i++)
            Line(i == 0 ? "wrote" : "", result.Files[i]);
    }

    private static void WriteTotals(RunPlan plan, RunResult result, RunTotals totals)
    {
        string unit = UnitOf(plan);
        double pixels = plan.Kinds.Sum(k => (double)k.Count * k.Layout.Length);
        if (plan.Steps.Any(s => s.Filter.Plugin.Kind == FilterKind.Selective))
        {
            string share = Describe.Short((totals.ReplacedBright + totals.ReplacedDark) / pixels * 1e6);
            Line("replaced", $"{totals.ReplacedBright} bright and {totals.ReplacedDark} dark pixels, {share} ppm");
            Line("kept", $"{Describe.Count(totals.KeptAsSource, "bright pixel")} no sharper than the optics, kept as sources");
        }

        Line("untouched", $"{totals.Saturated} saturated and {totals.Missing} missing samples");
        string part = totals.FluxIn == 0 ? "" : $" ({Describe.Short(totals.FluxRemoved / totals.FluxIn * 100)} % of {Describe.Number(totals.FluxIn)})";
        Line("flux", $"{Describe.Number(totals.FluxRemoved)} {unit} removed{part}");
        if (Median(result, r => r.NoiseBefore) is { } before && Median(result, r => r.NoiseAfter) is { } after)
            Line("noise", $"sigma {Describe.Short(before)} {unit} before, {Describe.Short(after)} {unit} after (median over frames)");
    }

    private static IEnumerable<string> Notes(RunPlan plan)
    {
        string[] smoothing = [.. plan.Kinds.SelectMany(k => k.Steps).Select(s => s.Step.Filter.Plugin)
            .Where(f => f.Kind == FilterKind.Smoothing).Select(f => f.Id).Distinct()];
        if (smoothing.Length == 0)
            yield break;
        yield return $"{string.Join(" and ", smoothing)} wrote every pixel anew. Smoothing moves flux between neighbours, so single sources change "
            + "even where the total is kept; the wider the window, the more. Measure what must be exact on the input or after selective steps alone; "
            + "stacks filters NAME tells what each parameter does to sources.";
        yield return "After smoothing, gain and read noise of the header no longer give the errors of the pixels.";
    }

    private static void WriteSummary(IReadOnlyList<NightEntry> entries)
    {
        int made = entries.Count(e => e.Result is { Outcome: RunOutcome.Made });
        int before = entries.Count(e => e.Result is { Outcome: RunOutcome.AlreadyDone });
        int parts = entries.Count(e => e.Result is { Outcome: RunOutcome.PartOfAnother });
        NightEntry[] failed = [.. entries.Where(e => e.Fault is not null)];
        Console.WriteLine($"{Describe.Count(entries.Count - parts, "stack")}: {made} made, {before} done before, {failed.Length} failed" + (parts > 0 ? $", {Describe.Count(parts, "file")} of another's stack" : ""));
        foreach (NightEntry entry in failed)
        {
            string text = ErrorLine.Text(entry.Fault!);
            string which = text.StartsWith(entry.Item.Input, StringComparison.Ordinal) ? "" : entry.Item.Input + ": ";
            Line("failed", string.Create(CultureInfo.InvariantCulture, $"{which}{text} (exit code {entry.ExitCode})"));
        }
    }

    private static string UnitOf(RunPlan plan) => string.Join(" | ", plan.Kinds.Select(k => k.Layout.Unit).Distinct());

    private static double? Median(RunResult? result, Func<LedgerRow, double> column)
    {
        double[] values = result is null ? [] : [.. result.Ledger.Select(column).Where(double.IsFinite).Order()];
        return values.Length == 0 ? null : (values[(values.Length - 1) / 2] + values[values.Length / 2]) / 2;
    }

    private static void Line(string label, string text) => Console.WriteLine($"  {label,-9} {text}".TrimEnd());
}
