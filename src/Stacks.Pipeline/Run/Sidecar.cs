using System.Text.Json;
using System.Text.Json.Nodes;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>What a sidecar says of the work and of the stack it stands beside, in lower-case hex.</summary>
/// <param name="Work">Digest of the work.</param>
/// <param name="Output">SHA-256 of the stack.</param>
internal sealed record SidecarDigests(string? Work, string? Output);

/// <summary>The provenance beside an output, as W3C PROV-JSON (Member Submission, 24 April 2013).</summary>
internal static class Sidecar
{
    private const string Output = "stacks:output";
    private const string Run = "stacks:run";
    private static readonly JsonSerializerOptions Layout = new() { WriteIndented = true };

    /// <summary>Digests out of a sidecar; null when it is not one.</summary>
    public static SidecarDigests? Read(string path)
    {
        try
        {
            JsonNode? root = JsonNode.Parse(File.ReadAllText(path));
            return new SidecarDigests(
                (string?)root?["activity"]?[Run]?["stacks:workDigest"], (string?)root?["entity"]?[Output]?["stacks:sha256"]);
        }
        catch (Exception fault) when (fault is JsonException or InvalidOperationException or IOException or UnauthorizedAccessException)
        {
            return null;
        }
    }

    /// <summary>Writes a sidecar.</summary>
    public static void Write(
        string path, ProvenanceRecord record, RunPlan plan, IReadOnlyList<NamedDigest> masks, IEnumerable<OutputFile> files, CancellationToken cancellation)
    {
        _ = (plan, masks);
        JsonObject root = new()
        {
            ["prefix"] = new JsonObject { ["stacks"] = "urn:stacks:" },
            ["entity"] = new JsonObject { [Output] = new JsonObject { ["stacks:sha256"] = Digests.OfFile(files.Last().Partial, cancellation) } },
            ["activity"] = new JsonObject { [Run] = new JsonObject { ["stacks:workDigest"] = record.WorkDigest } },
        };
        File.WriteAllText(path, root.ToJsonString(Layout) + "\n");
    }
}
