using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Tells a file's format by its first bytes, never by its name.</summary>
public static class FormatFinder
{
    private const int StartLength = 4096;

    /// <summary>The format of a file.</summary>
    /// <exception cref="InputMissingException">There is no such file.</exception>
    /// <exception cref="StackFormatException">No installed format knows the file.</exception>
    /// <exception cref="StackIOException">The file cannot be read.</exception>
    public static CatalogueFormat Of(string path, PluginCatalogue catalogue)
    {
        if (Directory.Exists(path))
            throw new StackFormatException(path, "is a folder, not a stack", "name the files in it");
        if (!File.Exists(path))
            throw new InputMissingException(path, "no such file", "check the path");
        byte[] start = Start(path);
        if (start.Length == 0)
            throw new StackFormatException(path, "is empty (0 bytes)", "fetch or write the file again");
        return catalogue.Formats.FirstOrDefault(f => f.Format.Recognises(start)) ?? throw Unknown(path, catalogue);
    }

    /// <summary>True for a file that begins as one of a known format does; and for one that cannot be read, which is not for a search to hide.</summary>
    public static bool IsStack(string path, PluginCatalogue catalogue)
    {
        try
        {
            byte[] start = Start(path);
            return start.Length > 0 && catalogue.Formats.Any(f => f.Format.Recognises(start));
        }
        catch (StackIOException)
        {
            return true;
        }
    }

    private static byte[] Start(string path)
    {
        try
        {
            using FileStream file = new(path, FileMode.Open, FileAccess.Read, FileShare.ReadWrite | FileShare.Delete, bufferSize: 0);
            byte[] start = new byte[StartLength];
            return start[..file.ReadAtLeast(start, StartLength, throwOnEndOfStream: false)];
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            throw new StackIOException(path, "cannot be read: " + e.Message.TrimEnd('.'), "check the file's permissions and its disk", e);
        }
    }

    private static StackFormatException Unknown(string path, PluginCatalogue catalogue)
    {
        string known = catalogue.Formats.Count == 0
            ? "no format plugin is installed"
            : "known formats are " + string.Join(", ", catalogue.Formats.Select(f => f.Format.Id));
        IStackFormat? promised = catalogue.Formats.Select(f => f.Format).FirstOrDefault(f => FormatNames.Carries(path, f));
        return promised is null
            ? new StackFormatException(path, "its first bytes are of no known format", known)
            : new StackFormatException(path, $"its name promises {promised.Id.ToUpperInvariant()} but its content is something else", known + "; check what wrote the file");
    }
}
