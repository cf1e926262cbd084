using System.Globalization;
using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>What <c>run --dry-run</c> prints: everything a run would do, resolved.</summary>
internal static class PlanReport
{
    /// <summary>For people.</summary>
    public static void WriteText(IReadOnlyList<NightEntry> entries, Resources resources)
    {
        foreach (NightEntry entry in entries)
        {
            if (entry.Plan is { } plan)
                WriteText(plan, resources);
            else
                Console.WriteLine($"{entry.Item.Input}: cannot be run: {ErrorLine.Text(entry.Fault!)}");
            Console.WriteLine();
        }

        Console.WriteLine("dry run: nothing was written");
    }

    /// <summary>For machines.</summary>
    public static void WriteJson(IReadOnlyList<NightEntry> entries, Resources resources, int exitCode) => JsonText.Write(new
    {
        DryRun = true,
        ExitCode = exitCode,
        Workers = resources.Workers,
        MemoryLimitBytes = resources.MemoryBytes,
        MemoryLimitFrom = resources.MemoryOrigin,
        Stacks = entries.Select(e => new
        {
            e.Item.Input,
            e.ExitCode,
            Error = e.Fault is null ? null : ErrorLine.Text(e.Fault),
            Plan = e.Plan is null ? null : Facts(e.Plan),
        }),
    });

    private static void WriteText(RunPlan plan, Resources resources)
    {
        Console.WriteLine($"{plan.Reader.Path} -> {plan.OutputPath}");
        if (plan.Recipe.Title.Length > 0)
            Line("title", plan.Recipe.Title);
        Line("input", $"{plan.Reader.Format.Id}, {Describe.Frames(plan.Reader.FrameCount)}");
        IReadOnlyList<string> stepsAbove = [];
        foreach (FrameKind kind in plan.Kinds)
        {
            IReadOnlyList<string> steps = [.. StepLines(kind)];
            Line("frames", (plan.Kinds.Count > 1 ? $"{kind.Count} from frame {kind.FirstFrame} on: " : "") + Describe.Layout(kind.Layout));
            Line("noise", kind.Noise ?? "no model");
            if (steps.SequenceEqual(stepsAbove))
                Line("steps", "as above");
            else
                Console.WriteLine(string.Join('\n', steps));
            stepsAbove = steps;
        }

        Line("output", $"{plan.OutputFormat.Id}, {string.Join(" | ", plan.Kinds.Select(k => k.Output.Name()).Distinct())}, "
            + $"{Describe.Name(plan.Recipe.Output.Compression)}, {(plan.WriteMask ? "with" : "without")} change mask"
            + (plan.Overwrite ? ", replacing what is there" : ""));
        if (LeftOut.Sentence(plan) is { } leftOut)
            Line("", leftOut);
        Line("machine", $"{plan.Workers} workers, {plan.FramesInFlight} frames in flight, {ByteSize.Show(plan.Memory!.For(plan.FramesInFlight))} needed "
            + $"of {ByteSize.Show(resources.MemoryBytes)} ({resources.MemoryOrigin})");
        Line("recipe", $"sha256 {plan.RecipeDigest}");
    }

    private static IEnumerable<string> StepLines(FrameKind kind)
    {
        for (int i = 0; i < kind.Steps.Count; i++)
        {
            KindStep step = kind.Steps[i];
            IFilterPlugin filter = step.Step.Filter.Plugin;
            yield return Labelled($"step {i + 1}", $"{filter.Id} ({step.Step.Filter.Origin.Assembly} {step.Step.Filter.Origin.Version}), "
                + (filter.Kind == FilterKind.Selective ? "selective" : "smoothing"));
            foreach (ResolvedParameter parameter in step.Resolved)
                yield return Labelled("", $"  {parameter.Name} = {parameter.Value} {parameter.Unit}".TrimEnd());
            yield return Labelled("", "  " + (step.Reach is { } reach ? $"reaches {reach.ToString(CultureInfo.InvariantCulture)} samples far" : "sees the whole frame"));
        }

        if (kind.Steps.Count == 0)
            yield return Labelled("steps", "none: frames are copied bit for bit");
        yield return Labelled("samples", string.Join(" -> ", SampleTypesOf(kind)));
    }

    private static IEnumerable<string> SampleTypesOf(FrameKind kind) =>
        [
            kind.Layout.SampleType.Name() + " read",
            .. kind.Steps.Select((s, i) => $"{Describe.Name(s.WorkType)} in step {i + 1}"),
            kind.Output.Name() + " written",
        ];

    private static object Facts(RunPlan plan) => new
    {
        Output = plan.OutputPath,
        InputFormat = plan.Reader.Format.Id,
        OutputFormat = plan.OutputFormat.Id,
        Frames = plan.Reader.FrameCount,
        Compression = Describe.Name(plan.Recipe.Output.Compression),
        ChangeMask = plan.WriteMask,
        NotCarried = LeftOut.Of(plan).Select(p => p.Name),
        plan.Workers,
        plan.FramesInFlight,
        MemoryBytes = plan.Memory!.For(plan.FramesInFlight),
        RecipeSha256 = plan.RecipeDigest,
        Kinds = plan.Kinds.Select(k => new
        {
            k.FirstFrame,
            Frames = k.Count,
            Layout = Describe.LayoutFacts(k.Layout),
            OutputType = k.Output.Name(),
            k.Noise,
            Steps = k.Steps.Select(s => new
            {
                Filter = s.Step.Filter.Plugin.Id,
                Plugin = s.Step.Filter.Origin.Assembly,
                s.Step.Filter.Origin.Version,
                PluginSha256 = s.Step.Filter.Origin.Digest,
                ComputesIn = Describe.Name(s.WorkType),
                s.Reach,
                s.ScratchBytes,
                Parameters = s.Resolved.Select(p => new { p.Name, p.Value, p.Unit }),
            }),
        }),
    };

    private static void Line(string label, string text) => Console.WriteLine(Labelled(label, text));

    private static string Labelled(string label, string text) => $"  {label,-9} {text}".TrimEnd();
}
