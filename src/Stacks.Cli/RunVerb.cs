using System.CommandLine;
using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary><c>run RECIPE STACK... -o PATH</c>: the night's work.</summary>
internal static class RunVerb
{
    public static Command Build(Option<bool> verbose)
    {
        Command verb = new("run", "Runs a recipe over one or more stacks. The inputs are never changed.");
        Argument<string> recipe = new("RECIPE") { Description = "the recipe, a TOML file" };
        Argument<string[]> stacks = CommonOptions.Stacks("the stacks to clean: files, folders of them, or patterns such as 'night/*.fits'");
        CommonOptions.RefuseOptions(recipe);
        Option<string> output = new("-o", "--output")
        {
            Description = "a folder for the results (made when absent), or for one stack the name of its result",
            HelpName = "PATH",
            Required = true,
        };
        Option<string[]> plugins = CommonOptions.Plugins();
        Option<int?> workers = new("--workers") { Description = "threads; default: what Slurm grants, else the processor count", HelpName = "N" };
        Option<string> memory = new("--memory") { Description = "memory the run may need, such as 4GiB; default: what Slurm grants, else 3/4 of the machine's", HelpName = "SIZE" };
        Option<bool> overwrite = new("--overwrite") { Description = "replace results that were made from other data, recipes or plugins" };
        Option<bool> salvage = new("--salvage") { Description = "take the whole frames of truncated stacks; the report and the result name the missing ones" };
        Option<bool> dryRun = new("--dry-run") { Description = "print the plan and stop: write nothing" };
        Option<bool> json = CommonOptions.Json();
        verb.Arguments.Add(recipe);
        verb.Arguments.Add(stacks);
        foreach (Option option in new Option[] { output, plugins, workers, memory, overwrite, salvage, dryRun, json })
            verb.Options.Add(option);
        verb.SetAction(parsed => CommonOptions.WithJsonErrors(parsed.GetValue(json), () => Execute(
            parsed.GetRequiredValue(recipe),
            parsed.GetRequiredValue(stacks),
            parsed.GetRequiredValue(output),
            CommonOptions.Catalogue(parsed, plugins),
            Resources.Find(Workers(parsed.GetValue(workers)), ByteSize.Parse("--memory", parsed.GetValue(memory)), Environment.GetEnvironmentVariable),
            parsed.GetValue(overwrite),
            parsed.GetValue(salvage),
            parsed.GetValue(dryRun),
            parsed.GetValue(json),
            parsed.GetValue(verbose))));
        return verb;
    }

    private static int Execute(
        string recipePath,
        string[] stacks,
        string output,
        PluginCatalogue catalogue,
        Resources resources,
        bool overwrite,
        bool salvage,
        bool dryRun,
        bool json,
        bool verbose)
    {
        Recipe recipe = RecipeReader.Read(recipePath);
        RunPlanner planner = new(recipe, catalogue, resources, overwrite, salvage);
        IReadOnlyList<InputSet> inputs = InputFiles.Of(stacks, catalogue);
        foreach (InputSet input in inputs)
            InputReport.Skipped(input);
        IReadOnlyList<NamedOutput> items = OutputNaming.Name([.. inputs.SelectMany(i => i.Files)], output, recipe, catalogue);
        using StopSignals stop = new();
        IReadOnlyList<NightEntry> entries = dryRun
            ? NightRun.Execute(items, planner, null, new FaultLines(verbose), stop.Token)
            : Progress.Watch(items.Count, verbose, progress => NightRun.Execute(items, planner, StackRun.Execute, progress, stop.Token));
        int exitCode = ExitOrder.Worst(entries.Select(e => e.ExitCode));
        switch (dryRun, json)
        {
            case (true, true):
                PlanReport.WriteJson(entries, resources, exitCode);
                break;
            case (true, false):
                PlanReport.WriteText(entries, resources);
                break;
            case (false, true):
                RunReport.WriteJson(entries, exitCode);
                break;
            default:
                RunReport.WriteText(entries);
                break;
        }

        return exitCode;
    }

    private static int? Workers(int? given) => given is null or (>= 1 and <= 4096)
        ? given
        : throw new UsageException($"--workers {given}", "is out of range", "give 1 to 4096");
}
