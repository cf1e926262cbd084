using System.Security.Cryptography;
using System.Text;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>A file by name, and the SHA-256 of its bytes in lower-case hex.</summary>
/// <param name="Name">File name without folder.</param>
/// <param name="Digest">SHA-256 in lower-case hex.</param>
internal sealed record NamedDigest(string Name, string Digest);

/// <summary>SHA-256 of files and of canonical texts.</summary>
internal static class Digests
{
    /// <summary>Of a file's bytes, lower-case hex.</summary>
    /// <exception cref="StackIOException">The file cannot be read.</exception>
    public static string OfFile(string path, CancellationToken cancellation)
    {
        byte[] buffer = GC.AllocateUninitializedArray<byte>(1 << 20);
        using IncrementalHash hash = IncrementalHash.CreateHash(HashAlgorithmName.SHA256);
        try
        {
            using FileStream file = new(path, FileMode.Open, FileAccess.Read, FileShare.ReadWrite | FileShare.Delete, 0, FileOptions.SequentialScan);
            for (int read = file.Read(buffer); read > 0; read = file.Read(buffer))
            {
                cancellation.ThrowIfCancellationRequested();
                hash.AppendData(buffer, 0, read);
            }
        }
        catch (Exception fault) when (fault is IOException or UnauthorizedAccessException)
        {
            throw new StackIOException(path, $"cannot be read ({fault.Message})", "check the file and its permissions", fault);
        }

        return Convert.ToHexStringLower(hash.GetHashAndReset());
    }

    /// <summary>Of a text's UTF-8 bytes, lower-case hex.</summary>
    public static string OfText(string text) => Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(text)));

    /// <summary>
    /// Equal work has equal digests: over program version, source, its other files, recipe, plugins and mask images, one a line.
    /// </summary>
    public static string OfWork(RunPlan plan, string version, string sourceDigest, IReadOnlyList<NamedDigest> others, IReadOnlyList<NamedDigest> masks)
    {
        List<string> lines = [$"version {version}", $"source {sourceDigest}", $"recipe {plan.RecipeDigest}"];
        lines.AddRange(others.Select(o => $"source {o.Digest}"));
        lines.AddRange(plan.FormatOrigins.Select(o => $"format {o.Assembly} {o.Digest}"));
        lines.AddRange(plan.Steps.Select(s => $"filter {s.Section.Filter} {s.Filter.Origin.Digest}"));
        lines.AddRange(masks.Select(m => $"mask {m.Digest}"));
        return OfText(string.Join('\n', lines) + '\n');
    }
}
