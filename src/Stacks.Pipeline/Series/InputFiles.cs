using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>What one argument of the command line names.</summary>
/// <param name="Name">The argument as given.</param>
/// <param name="IsSeries">True for a folder or a pattern.</param>
/// <param name="Files">The files, in natural order; of an argument that names a file, that one, whether it is there or not.</param>
/// <param name="Skipped">Files of a folder or a pattern that are no stacks.</param>
public sealed record InputSet(string Name, bool IsSeries, IReadOnlyList<string> Files, int Skipped);

/// <summary>
/// Finds the files that an argument names: itself, the stacks in a folder, or those whose names fit a pattern with
/// <c>*</c> and <c>?</c> in its last part. A stack is known by its first bytes. Hidden files, partial files and the
/// companions of earlier results are not taken.
/// </summary>
public static class InputFiles
{
    /// <summary>What each argument names, in order.</summary>
    /// <exception cref="InputMissingException">A folder or a pattern without a stack.</exception>
    /// <exception cref="StackIOException">A folder cannot be read.</exception>
    public static IReadOnlyList<InputSet> Of(IEnumerable<string> arguments, PluginCatalogue catalogue) => [.. arguments.Select(a => Of(a, catalogue))];

    private static InputSet Of(string argument, PluginCatalogue catalogue)
    {
        bool isFolder = Directory.Exists(argument);
        string name = Path.GetFileName(argument);
        if (!isFolder && (File.Exists(argument) || !name.AsSpan().ContainsAny('*', '?')))
            return new InputSet(argument, false, [argument], 0);

        string folder = isFolder ? argument : Path.GetDirectoryName(argument) is { Length: > 0 } parent ? parent : ".";
        if (!Directory.Exists(folder))
            throw new InputMissingException(argument, $"no folder {folder}", "check the path");
        string[] found = FilesIn(folder, isFolder ? "*" : name);
        string[] stacks = [.. found.Where(path => FormatFinder.IsStack(path, catalogue)).Order(NaturalOrder.Instance)];
        if (stacks.Length == 0)
            throw new InputMissingException(argument, $"names no stack ({found.Length} other files)", "name a folder or a pattern with stacks of a known format");

        // Names in the folder that is asked for without a folder stay without one.
        return new InputSet(argument, true, isFolder || folder != "." ? stacks : [.. stacks.Select(path => Path.GetFileName(path))], found.Length - stacks.Length);
    }

    private static string[] FilesIn(string folder, string pattern)
    {
        try
        {
            HashSet<string> companions = [.. Directory.GetFiles(folder, "*" + OutputFiles.SidecarEnding).SelectMany(s => Sidecar.Read(s)?.Companions ?? []).Select(c => c.Name)];
            return
            [
                .. new DirectoryInfo(folder).EnumerateFiles(pattern, new EnumerationOptions { MatchType = MatchType.Simple, AttributesToSkip = FileAttributes.Hidden })
                    .Where(f => !f.Name.EndsWith(OutputFiles.PartialEnding, StringComparison.Ordinal)
                        && !f.Name.EndsWith(OutputFiles.SidecarEnding, StringComparison.Ordinal)
                        && !companions.Contains(f.Name))
                    .Select(f => Path.Combine(folder, f.Name)),
            ];
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            throw new StackIOException(folder, "cannot be read: " + e.Message.TrimEnd('.'), "check the folder's permissions and its disk", e);
        }
    }
}
