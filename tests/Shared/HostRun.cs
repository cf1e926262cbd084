using Stacks.Pipeline;

namespace Stacks.TestSupport;

/// <summary>A run as the host does it, with the plugins staged beside the host, in the test's own process.</summary>
public static class HostRun
{
    private static readonly PluginCatalogue Catalogue = PluginCatalogue.Load(Path.GetDirectoryName(Checkout.Host)!, []);

    /// <summary>Runs a recipe given as text; an output that is there is replaced.</summary>
    public static RunResult Of(string recipe, string source, string target, int workers = 2, IProgress<RunProgress>? progress = null)
    {
        Recipe parsed = RecipeReader.Parse(recipe, target + ".toml");
        NamedOutput item = OutputNaming.Name([source], Path.GetDirectoryName(target)! + "/out/", parsed, Catalogue).Single() with { Output = target };
        using RunPlan plan = new RunPlanner(parsed, Catalogue, new Resources(workers, 1L << 30, "the test"), overwrite: true).Plan(item);
        return StackRun.Execute(plan, progress, CancellationToken.None);
    }
}
