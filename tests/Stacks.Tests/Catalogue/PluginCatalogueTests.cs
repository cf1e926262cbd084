using System.Reflection;
using System.Runtime.Loader;
using System.Security.Cryptography;
using Stacks.Abstractions;
using Stacks.Pipeline;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Catalogue;

/// <summary>A plugin that no project references, loaded from its folder; and folders that hold something else.</summary>
public sealed class PluginCatalogueTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    /// <summary>Where the build puts the test plugin.</summary>
    internal static string PluginFolder { get; } = Path.Combine(
        Checkout.Root, "tests", "Stacks.TestPlugin", "bin", Path.GetFileName(Path.GetDirectoryName(Path.GetDirectoryName(Checkout.Host)!)!), "net10.0");

    private static string PluginFile => Path.Combine(PluginFolder, "Stacks.TestPlugin.dll");

    [Fact]
    public void Plugin_is_loaded_from_a_named_folder_in_a_context_of_its_own()
    {
        PluginCatalogue catalogue = PluginCatalogue.Load(folder.Path, [PluginFolder]);

        CatalogueFilter filter = Assert.Single(catalogue.Filters);
        Assert.Equal("test-mirror", filter.Plugin.Id);
        Assert.Empty(catalogue.Formats);
        Assembly assembly = filter.Plugin.GetType().Assembly;
        Assert.NotSame(AssemblyLoadContext.Default, AssemblyLoadContext.GetLoadContext(assembly));
        Assert.DoesNotContain(AssemblyLoadContext.Default.Assemblies, a => a.GetName().Name == "Stacks.TestPlugin");
        Assert.DoesNotContain(typeof(PluginCatalogueTests).Assembly.GetReferencedAssemblies(), a => a.Name == "Stacks.TestPlugin");
    }

    [Fact]
    public void Origin_names_assembly_version_file_and_digest()
    {
        PluginOrigin origin = PluginCatalogue.Load(folder.Path, [PluginFolder]).Filters[0].Origin;

        Assert.Equal("Stacks.TestPlugin", origin.Assembly);
        Assert.Equal("0.1.0", origin.Version);
        Assert.Equal(PluginFile, origin.Path);
        Assert.Equal(Convert.ToHexStringLower(SHA256.HashData(File.ReadAllBytes(PluginFile))), origin.Digest);
    }

    [Fact]
    public void Contracts_come_from_the_host_even_where_a_copy_lies_beside_the_plugin()
    {
        string place = Install("plugins", "Stacks.TestPlugin");
        File.Copy(typeof(IFilterPlugin).Assembly.Location, Path.Combine(place, "Stacks.Abstractions.dll"));
        // Without the list of its dependencies, a plugin's dependencies are all files in its folder.
        File.Delete(Path.Combine(place, "Stacks.TestPlugin.deps.json"));

        CatalogueFilter filter = Assert.Single(PluginCatalogue.Load(folder.Path, []).Filters);

        Type contract = filter.Plugin.GetType().GetInterfaces().Single(i => i.Name == nameof(IFilterPlugin));
        Assert.Same(typeof(IFilterPlugin), contract);
    }

    [Fact]
    public void Folder_beside_the_host_is_scanned_and_the_working_directory_is_not()
    {
        Install("plugins", "Stacks.TestPlugin");
        Install("elsewhere", "plugins", "Stacks.TestPlugin");

        Assert.Single(PluginCatalogue.Load(folder.Path, []).Filters);
        // Assert.Empty on a host whose own folder has none, started where a plugins folder lies.
        ToolResult listed = Tool.RunWith(new Dictionary<string, string>(), "sh", "-c", $"cd '{folder.Path}' && exec dotnet '{Checkout.Host}' filters");
        Assert.Equal(0, listed.ExitCode);
        Assert.DoesNotContain("test-mirror", listed.Output, StringComparison.Ordinal);
    }

    [Fact]
    public void A_folder_of_plugin_folders_can_be_named()
    {
        Install("mine", "Stacks.TestPlugin");

        Assert.Single(PluginCatalogue.Load(folder.Path, [folder.File("mine")]).Filters);
    }

    [Fact]
    public void A_file_that_is_no_assembly_is_named_with_the_cause()
    {
        string place = Directory.CreateDirectory(Path.Combine(folder.Path, "plugins", "Broken")).FullName;
        string file = Path.Combine(place, "Broken.dll");
        File.WriteAllText(file, "this is no assembly");

        PluginException fault = Assert.Throws<PluginException>(() => PluginCatalogue.Load(folder.Path, []));

        Assert.StartsWith(file + ": cannot be loaded: ", fault.Message, StringComparison.Ordinal);
        Assert.Contains("format", fault.Message, StringComparison.OrdinalIgnoreCase);
        Assert.DoesNotContain('\n', fault.Message);
        Assert.Equal(70, fault.ExitCode);
    }

    [Fact]
    public void An_assembly_without_filters_and_formats_is_named()
    {
        string place = Directory.CreateDirectory(Path.Combine(folder.Path, "plugins", "Stacks.Noise")).FullName;
        string file = Path.Combine(place, "Stacks.Noise.dll");
        File.Copy(Path.Combine(AppContext.BaseDirectory, "Stacks.Noise.dll"), file);

        PluginException fault = Assert.Throws<PluginException>(() => PluginCatalogue.Load(folder.Path, []));

        Assert.StartsWith(file + ": holds no filter and no format", fault.Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Two_plugins_with_one_id_are_an_error_that_names_both()
    {
        string first = Path.Combine(Install("plugins", "Stacks.TestPlugin"), "Stacks.TestPlugin.dll");

        PluginException fault = Assert.Throws<PluginException>(() => PluginCatalogue.Load(folder.Path, [PluginFolder]));

        Assert.Contains(first, fault.Message, StringComparison.Ordinal);
        Assert.Contains(PluginFile, fault.Message, StringComparison.Ordinal);
        Assert.Contains("filter test-mirror", fault.Message, StringComparison.Ordinal);
    }

    [Fact]
    public void One_plugin_named_twice_is_loaded_once() =>
        Assert.Single(PluginCatalogue.Load(folder.Path, [PluginFolder, PluginFolder + Path.DirectorySeparatorChar]).Filters);

    [Theory]
    [InlineData("none", "no such folder")]
    [InlineData("empty", "holds no plugin")]
    public void Named_folders_must_hold_plugins(string name, string says)
    {
        Directory.CreateDirectory(folder.File("empty"));

        UsageException fault = Assert.Throws<UsageException>(() => PluginCatalogue.Load(folder.Path, [folder.File(name)]));

        Assert.Contains(says, fault.Message, StringComparison.Ordinal);
        Assert.Equal(64, fault.ExitCode);
    }

    private string Install(params string[] parts)
    {
        string place = Directory.CreateDirectory(Path.Combine([folder.Path, .. parts])).FullName;
        foreach (string file in Directory.GetFiles(PluginFolder).Where(f => f.EndsWith(".dll", StringComparison.Ordinal) || f.EndsWith(".deps.json", StringComparison.Ordinal)))
            File.Copy(file, Path.Combine(place, Path.GetFileName(file)));
        return place;
    }
}
