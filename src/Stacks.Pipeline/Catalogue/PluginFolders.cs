using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Finds plugin assemblies. Folders are taken in ordinal order of their names, so that a machine's listing order does not matter.</summary>
internal static class PluginFolders
{
    /// <summary>The assemblies in the folders below <paramref name="folder"/>; none when it does not exist.</summary>
    public static IEnumerable<string> Below(string folder) => Directory.Exists(folder)
        ? Directory.GetDirectories(folder).Order(StringComparer.Ordinal).SelectMany(Inside)
        : [];

    /// <summary>
    /// The assemblies of one plugin's folder: the one with the folder's name, else those with a .deps.json of their own
    /// (other files are their dependencies).
    /// </summary>
    public static IEnumerable<string> Inside(string folder)
    {
        string named = Path.Combine(folder, Path.GetFileName(Path.TrimEndingDirectorySeparator(folder)) + ".dll");
        return File.Exists(named)
            ? [named]
            : Directory.GetFiles(folder, "*.dll").Where(f => File.Exists(Path.ChangeExtension(f, ".deps.json"))).Order(StringComparer.Ordinal);
    }

    /// <summary>A folder that the user named: one plugin's own, or one that holds plugin folders.</summary>
    /// <exception cref="UsageException">It does not exist, or holds no plugin.</exception>
    public static IReadOnlyList<string> Named(string folder)
    {
        string full = Path.GetFullPath(folder);
        if (!Directory.Exists(full))
            throw new UsageException($"--plugins {folder}", "no such folder", "name a folder that holds a plugin or plugin folders");
        List<string> found = [.. Inside(full), .. Below(full)];
        return found.Count > 0
            ? found
            : throw new UsageException($"--plugins {folder}", "holds no plugin",
                "a plugin is NAME.dll in a folder NAME, or a .dll beside its .deps.json");
    }
}
