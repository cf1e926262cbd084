namespace Stacks.Pipeline;

/// <summary>One spelling for each file: absolute, with symbolic links followed.</summary>
internal static class RealPath
{
    private const int MostLinks = 40; // as in the Linux kernel

    /// <summary>
    /// The path with every link in it followed; parts that do not exist stay as they are. Hard links need no care: a
    /// result is written under another name and renamed, which leaves the other names of an old file alone.
    /// </summary>
    public static string Of(string path)
    {
        string full = Path.GetFullPath(path);
        string real = Path.GetPathRoot(full)!;
        Queue<string> parts = new(full[real.Length..].Split(Path.DirectorySeparatorChar, StringSplitOptions.RemoveEmptyEntries));
        int links = 0;
        while (parts.TryDequeue(out string? part))
        {
            string next = Path.Combine(real, part);
            string? linked = links < MostLinks ? LinkTarget(next) : null;
            if (linked is null)
            {
                real = next;
                continue;
            }

            links++;
            full = Path.GetFullPath(Path.Combine([linked, .. parts]), real);
            real = Path.GetPathRoot(full)!;
            parts = new(full[real.Length..].Split(Path.DirectorySeparatorChar, StringSplitOptions.RemoveEmptyEntries));
        }

        return real;
    }

    private static string? LinkTarget(string path)
    {
        try
        {
            return new FileInfo(path).LinkTarget;
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            return null;
        }
    }
}
