using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>What file names say about formats.</summary>
internal static class FormatNames
{
    /// <summary>Endings of whole-file and tile compression that stand after a format's own ending.</summary>
    private static readonly string[] Wrappers = [".gz", ".fz"];

    /// <summary>The ending of <paramref name="path"/> that promises the format, as it is spelt there; null when there is none.</summary>
    public static string? EndingOf(string path, IStackFormat format) =>
        format.Endings.FirstOrDefault(e => path.EndsWith(e, StringComparison.OrdinalIgnoreCase)) is { } ending
            ? path[^ending.Length..]
            : null;

    /// <summary>True when the name promises the format, wrapped or not.</summary>
    public static bool Carries(string path, IStackFormat format) => EndingOf(Unwrapped(path), format) is not null;

    /// <summary>The name without a wrapper's ending.</summary>
    public static string Unwrapped(string path) =>
        Wrappers.FirstOrDefault(w => path.EndsWith(w, StringComparison.OrdinalIgnoreCase)) is { } wrapper ? path[..^wrapper.Length] : path;
}
