using System.Reflection.Metadata;
using System.Reflection.PortableExecutable;
using System.Text.RegularExpressions;
using System.Xml.Linq;
using Stacks.Pipeline;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Layering;

/// <summary>Who may know whom: the rules of the house, read from project files, from built assemblies and from sources.</summary>
public partial class LayeringTests
{
    /// <summary>Each project of src with the projects it may know, itself not counted.</summary>
    private static readonly Dictionary<string, string[]> MayKnow = new()
    {
        ["Stacks.Abstractions"] = [],
        ["Stacks.Imaging"] = ["Stacks.Abstractions"],
        ["Stacks.Noise"] = ["Stacks.Abstractions", "Stacks.Imaging"],
        ["Stacks.Pipeline"] = ["Stacks.Abstractions", "Stacks.Imaging", "Stacks.Noise"],
        ["Stacks.Cli"] = ["Stacks.Abstractions", "Stacks.Imaging", "Stacks.Noise", "Stacks.Pipeline"],
    };

    /// <summary>Heads of columns in a table of statistics, which are filters' names too.</summary>
    private static readonly string[] StatisticsHeads = ["minimum", "median", "maximum"];

    private static readonly string[] PluginMayKnow = ["Stacks.Abstractions", "Stacks.Imaging"];

    private static string Source => Path.Combine(Checkout.Root, "src");

    private static string Plugins => Path.Combine(Checkout.Root, "plugins");

    [Fact]
    public void Every_project_has_its_rule() =>
        Assert.Equal(MayKnow.Keys.Order(), Directory.GetDirectories(Source).Select(Path.GetFileName).Order());

    [Fact]
    public void Project_references_point_down_only()
    {
        foreach ((string project, string[] allowed) in MayKnow)
            Assert.Empty(References(Path.Combine(Source, project)).Except(allowed));
    }

    [Fact]
    public void Plugins_reference_abstractions_and_imaging_alone()
    {
        string[] folders = Directory.GetDirectories(Plugins);
        Assert.NotEmpty(folders);
        foreach (string folder in folders)
            Assert.Empty(References(folder).Except(PluginMayKnow));
        Assert.Equal(PluginMayKnow.Order(), References(Plugins).Order());
    }

    [Fact]
    public void Built_assemblies_know_no_more_than_their_projects_may()
    {
        string host = Path.GetDirectoryName(Checkout.Host)!;
        foreach ((string project, string[] allowed) in MayKnow)
        {
            string file = project == "Stacks.Cli" ? Checkout.Host : Path.Combine(host, project + ".dll");
            Assert.Empty(StacksReferencesOf(file).Except(allowed));
        }

        foreach (string folder in Directory.GetDirectories(Path.Combine(host, "plugins")))
            Assert.Empty(StacksReferencesOf(Path.Combine(folder, Path.GetFileName(folder) + ".dll")).Except(PluginMayKnow));
    }

    [Fact]
    public void Contracts_need_the_base_library_alone() => Assert.Empty(
        XDocument.Load(Path.Combine(Source, "Stacks.Abstractions", "Stacks.Abstractions.csproj")).Descendants("PackageReference"));

    [Fact]
    public void A_plugin_folder_holds_no_copy_of_the_contracts()
    {
        string plugins = Path.Combine(Path.GetDirectoryName(Checkout.Host)!, "plugins");
        Assert.Empty(Directory.GetFiles(plugins, "Stacks.Abstractions.dll", SearchOption.AllDirectories));
        Assert.Empty(Directory.GetFiles(plugins, "Stacks.Imaging.dll", SearchOption.AllDirectories));
    }

    /// <summary>The host and the pipeline find filters and formats in the catalogue; a name of one in their code would bind them to it.</summary>
    [Fact]
    public void Pipeline_and_host_name_no_filter_and_no_format()
    {
        PluginCatalogue catalogue = PluginCatalogue.Load(Path.GetDirectoryName(Checkout.Host)!, []);
        string[] names = [.. catalogue.Filters.Select(f => f.Plugin.Id), .. catalogue.Formats.Select(f => f.Format.Id),
            .. catalogue.Filters.Select(f => f.Origin.Assembly), .. catalogue.Formats.Select(f => f.Origin.Assembly)];
        Assert.NotEmpty(names);
        foreach (string project in new[] { "Stacks.Pipeline", "Stacks.Cli", "Stacks.Noise" })
        {
            foreach (string file in Sources(Path.Combine(Source, project)))
            {
                string[] forbidden = Path.GetFileName(file) == "InspectReport.cs" ? [.. names.Except(StatisticsHeads)] : names;
                foreach (Match quoted in Quoted().Matches(WithoutComments(File.ReadAllText(file))))
                    Assert.False(forbidden.Contains(quoted.Groups[1].Value, StringComparer.OrdinalIgnoreCase), $"{file} names {quoted.Value}");
            }
        }
    }

    private static IEnumerable<string> References(string folder) =>
        Directory.GetFiles(folder, "*.csproj").Concat(Directory.GetFiles(folder, "Directory.Build.props"))
            .SelectMany(f => XDocument.Load(f).Descendants("ProjectReference"))
            .Where(r => r.Attribute("ReferenceOutputAssembly")?.Value != "false")
            .Select(r => Path.GetFileNameWithoutExtension(r.Attribute("Include")!.Value));

    private static string[] StacksReferencesOf(string file)
    {
        using PEReader image = new(File.OpenRead(file));
        MetadataReader metadata = image.GetMetadataReader();
        return [.. metadata.AssemblyReferences.Select(r => metadata.GetString(metadata.GetAssemblyReference(r).Name))
            .Where(n => n.StartsWith("Stacks.", StringComparison.Ordinal))];
    }

    private static IEnumerable<string> Sources(string folder) => Directory.GetFiles(folder, "*.cs", SearchOption.AllDirectories)
        .Where(f => !Path.GetRelativePath(folder, f).StartsWith("bin", StringComparison.Ordinal) && !Path.GetRelativePath(folder, f).StartsWith("obj", StringComparison.Ordinal));

    private static string WithoutComments(string code) => Comment().Replace(code, "");

    [GeneratedRegex("\"([^\"\\n]*)\"")]
    private static partial Regex Quoted();

    [GeneratedRegex("^\\s*//.*$", RegexOptions.Multiline)]
    private static partial Regex Comment();
}
