using System.CommandLine;
using Stacks.Abstractions;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary><c>filters [NAME]</c>: what is installed, and what each parameter means; all from the plugins' own declarations.</summary>
internal static class FiltersVerb
{
    public static Command Build()
    {
        Command verb = new("filters", "Lists the installed filters, or explains one of them and its parameters.");
        Argument<string?> name = new("NAME") { Description = "a filter's name", Arity = ArgumentArity.ZeroOrOne };
        CommonOptions.RefuseOptions(name);
        Option<string[]> plugins = CommonOptions.Plugins();
        Option<bool> json = CommonOptions.Json();
        verb.Arguments.Add(name);
        verb.Options.Add(plugins);
        verb.Options.Add(json);
        verb.SetAction(parsed => Show(CommonOptions.Catalogue(parsed, plugins), parsed.GetValue(name), parsed.GetValue(json)));
        return verb;
    }

    private static int Show(PluginCatalogue catalogue, string? name, bool json)
    {
        if (name is null)
        {
            if (json)
                JsonText.Write(new { Filters = catalogue.Filters.Select(Facts), Formats = catalogue.Formats.Select(f => new { f.Format.Id, Plugin = Origin(f.Origin) }) });
            else
                ListAll(catalogue);
            return ExitCodes.Done;
        }

        CatalogueFilter filter = catalogue.Filter(name)
            ?? throw new UsageException($"filters {name}", "no such filter is installed", NearestWord.Remedy(name, [.. catalogue.Filters.Select(f => f.Plugin.Id)]));
        if (json)
            JsonText.Write(Facts(filter));
        else
            Explain(filter);
        return ExitCodes.Done;
    }

    private static void ListAll(PluginCatalogue catalogue)
    {
        TextTable table = new("filter", "kind", "noise model", "what it does");
        foreach (CatalogueFilter filter in catalogue.Filters)
            table.Add(filter.Plugin.Id, Kind(filter.Plugin), filter.Plugin.NeedsNoise ? "needed" : "-", Headline(filter.Plugin.Summary));
        table.Write(Console.Out);
        Console.WriteLine();
        Console.WriteLine("formats: " + string.Join(", ", catalogue.Formats.Select(f => f.Format.Id)));
        Console.WriteLine("stacks filters NAME explains one filter and its parameters.");
    }

    private static void Explain(CatalogueFilter filter)
    {
        IFilterPlugin plugin = filter.Plugin;
        Console.WriteLine($"{plugin.Id}: {plugin.Summary}");
        Console.WriteLine($"  source      {plugin.Source}");
        Console.WriteLine($"  kind        {Kind(plugin)}: {(plugin.Kind == FilterKind.Selective
            ? "replaces single pixels; all others keep their stored bits"
            : "writes every pixel anew")}");
        Console.WriteLine($"  linearity   {Promise(plugin.Equivariance)}");
        Console.WriteLine($"  noise       {(plugin.NeedsNoise ? "needs a [noise] table in the recipe" : "needs no noise model")}");
        Console.WriteLine($"  exact in    {string.Join(", ", plugin.WorkTypes.Select(Describe.Name))}");
        Console.WriteLine($"  plugin      {filter.Origin.Assembly} {filter.Origin.Version}, sha256 {filter.Origin.Digest}");
        foreach (ParameterSpec spec in plugin.Parameters)
        {
            Console.WriteLine();
            Console.WriteLine($"  {spec.Name}{(spec.Unit.Length > 0 ? $" ({spec.Unit})" : "")}: {spec.Meaning}");
            Console.WriteLine($"    default   {spec.Default?.ToString() ?? "none: the recipe must state it"}");
            Console.WriteLine($"    allowed   {spec.Range}");
            Console.WriteLine($"    raised    {spec.WhenRaised}");
            Console.WriteLine($"    lowered   {spec.WhenLowered}");
        }
    }

    private static object Facts(CatalogueFilter filter) => new
    {
        filter.Plugin.Id,
        filter.Plugin.Summary,
        filter.Plugin.Source,
        Kind = Kind(filter.Plugin),
        Equivariance = filter.Plugin.Equivariance == Equivariance.Affine ? "affine" : "scale",
        filter.Plugin.NeedsNoise,
        WorkTypes = filter.Plugin.WorkTypes.Select(Describe.Name),
        Plugin = Origin(filter.Origin),
        Parameters = filter.Plugin.Parameters.Select(p => new
        {
            p.Name,
            p.Unit,
            Default = p.Default?.ToString(),
            Allowed = p.Range,
            p.Meaning,
            p.WhenRaised,
            p.WhenLowered,
        }),
    };

    private static object Origin(PluginOrigin origin) => new { origin.Assembly, origin.Version, origin.Path, Sha256 = origin.Digest };

    /// <summary>A summary up to its formula.</summary>
    private static string Headline(string summary) => summary.Split(": ", 2)[0];

    private static string Kind(IFilterPlugin plugin) => plugin.Kind == FilterKind.Selective ? "selective" : "smoothing";

    private static string Promise(Equivariance promise) => promise == Equivariance.Affine
        ? "F(a v + b) = a F(v) + b for a > 0, with the noise scaled by a"
        : "F(a v) = a F(v) for a > 0";

}
