using System.Reflection;
using System.Security.Cryptography;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>A format in the catalogue.</summary>
/// <param name="Format">The format.</param>
/// <param name="Origin">Where it comes from.</param>
public sealed record CatalogueFormat(IStackFormat Format, PluginOrigin Origin);

/// <summary>
/// The filters and formats that are installed. Plugins come from the folder <c>plugins</c> beside the host and from
/// folders the user names; nothing is loaded from the working directory. Each plugin has a load context of its own.
/// </summary>
public sealed class PluginCatalogue
{
    /// <summary>A catalogue of what is given.</summary>
    internal PluginCatalogue(IReadOnlyList<CatalogueFilter> filters, IReadOnlyList<CatalogueFormat> formats)
    {
        Filters = filters;
        Formats = formats;
    }

    /// <summary>The filters, by id.</summary>
    public IReadOnlyList<CatalogueFilter> Filters { get; }

    /// <summary>The formats, by id.</summary>
    public IReadOnlyList<CatalogueFormat> Formats { get; }

    /// <summary>Loads all plugins.</summary>
    /// <param name="hostFolder">Folder of the host; plugins are in its sub-folder <c>plugins</c>.</param>
    /// <param name="named">Further folders, each one plugin's own or one that holds plugin folders.</param>
    /// <exception cref="PluginException">A file is no plugin or cannot be loaded, or two plugins claim one id.</exception>
    /// <exception cref="UsageException">A named folder does not exist or holds no plugin.</exception>
    public static PluginCatalogue Load(string hostFolder, IReadOnlyList<string> named)
    {
        List<CatalogueFilter> filters = [];
        List<CatalogueFormat> formats = [];
        IEnumerable<string> files = PluginFolders.Below(Path.Combine(hostFolder, "plugins")).Concat(named.SelectMany(PluginFolders.Named));
        foreach (string file in files.Distinct(StringComparer.Ordinal))
            LoadFile(file, filters, formats);
        RefuseTwins(filters.Select(f => ("filter " + f.Plugin.Id, f.Origin)));
        RefuseTwins(formats.Select(f => ("format " + f.Format.Id, f.Origin)));
        return new PluginCatalogue(
            [.. filters.OrderBy(f => f.Plugin.Id, StringComparer.Ordinal)], [.. formats.OrderBy(f => f.Format.Id, StringComparer.Ordinal)]);
    }

    /// <summary>The filter with an id; null when there is none.</summary>
    public CatalogueFilter? Filter(string id) => Filters.FirstOrDefault(f => f.Plugin.Id == id);

    /// <summary>The format with an id; null when there is none.</summary>
    public CatalogueFormat? Format(string id) => Formats.FirstOrDefault(f => f.Format.Id == id);

    private static void LoadFile(string file, List<CatalogueFilter> filters, List<CatalogueFormat> formats)
    {
        try
        {
            Assembly assembly = new PluginLoadContext(file).LoadFromAssemblyPath(file);
            AssemblyName name = assembly.GetName();
            using FileStream bytes = File.OpenRead(file);
            PluginOrigin origin = new(name.Name!, VersionOf(assembly), file, Convert.ToHexStringLower(SHA256.HashData(bytes)));
            int before = filters.Count + formats.Count;
            foreach (Type type in assembly.GetExportedTypes().Where(t => t is { IsClass: true, IsAbstract: false, ContainsGenericParameters: false }))
            {
                if (typeof(IFilterPlugin).IsAssignableFrom(type))
                    filters.Add(new CatalogueFilter((IFilterPlugin)Activator.CreateInstance(type)!, origin));
                if (typeof(IStackFormat).IsAssignableFrom(type))
                    formats.Add(new CatalogueFormat((IStackFormat)Activator.CreateInstance(type)!, origin));
            }

            if (filters.Count + formats.Count == before)
                throw new PluginException(file, "holds no filter and no format", "remove it from the plugin folder, or build it against this program's contracts");
        }
        catch (Exception e) when (e is not StacksException and not OutOfMemoryException)
        {
            Exception cause = e is TargetInvocationException { InnerException: { } inner } ? inner : e;
            throw new PluginException(file, "cannot be loaded: " + OneLine(cause), "rebuild the plugin for this program, or take it out of the folder", e);
        }
    }

    private static string VersionOf(Assembly assembly) =>
        assembly.GetCustomAttribute<AssemblyInformationalVersionAttribute>()?.InformationalVersion
        ?? assembly.GetName().Version?.ToString() ?? "0";

    private static void RefuseTwins(IEnumerable<(string Name, PluginOrigin Origin)> all)
    {
        foreach (IGrouping<string, (string Name, PluginOrigin Origin)> twins in all.GroupBy(a => a.Name).Where(g => g.Count() > 1))
        {
            string paths = string.Join(" and ", twins.Select(t => t.Origin.Path).Distinct());
            throw new PluginException(paths, $"both bring the {twins.Key}", "take one of them out of the plugin folders");
        }
    }

    private static string OneLine(Exception e) => e.Message.ReplaceLineEndings(" ").TrimEnd('.', ' ');
}
