using System.Globalization;
using System.Text.Encodings.Web;
using System.Text.Json;
using System.Text.Json.Nodes;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>What a sidecar says of the work and of the stack it stands beside, in lower-case hex.</summary>
/// <param name="Work">Digest of the work; null where it says none.</param>
/// <param name="Output">SHA-256 of the stack; null where it says none.</param>
/// <param name="Companions">The other files of the output.</param>
internal sealed record SidecarDigests(string? Work, string? Output, IReadOnlyList<NamedDigest> Companions);

/// <summary>
/// The provenance beside an output, as W3C PROV-JSON (Member Submission, 24 April 2013): entities with their SHA-256,
/// one activity with the parameters, the software agents, and who used, made and came from what. File names only.
/// </summary>
internal static class Sidecar
{
    private const string Companion = "stacks:companion";
    private const string Output = "stacks:output";
    private const string Recipe = "stacks:recipe";
    private const string Run = "stacks:run";

    // The file is read by people and programs, never as part of a web page: + and µ need no escapes.
    private static readonly JsonSerializerOptions Indented = new() { WriteIndented = true, Encoder = JavaScriptEncoder.UnsafeRelaxedJsonEscaping };

    /// <summary>Digests out of a sidecar; null when it is not one.</summary>
    public static SidecarDigests? Read(string path)
    {
        try
        {
            JsonNode? root = JsonNode.Parse(File.ReadAllText(path));
            IEnumerable<NamedDigest> companions = (root?["entity"] as JsonObject ?? [])
                .Where(e => e.Key.StartsWith(Companion, StringComparison.Ordinal))
                .Select(e => new NamedDigest((string?)e.Value?["prov:label"] ?? "", (string?)e.Value?["stacks:sha256"] ?? ""));
            return new SidecarDigests(
                (string?)root?["activity"]?[Run]?["stacks:workDigest"], (string?)root?["entity"]?[Output]?["stacks:sha256"], [.. companions]);
        }
        catch (Exception fault) when (fault is JsonException or InvalidOperationException or IOException or UnauthorizedAccessException)
        {
            return null;
        }
    }

    /// <summary>Writes a sidecar.</summary>
    /// <param name="path">Path to write.</param>
    /// <param name="record">Who did what.</param>
    /// <param name="plan">The plan, for file names and plugins.</param>
    /// <param name="others">The source's other files.</param>
    /// <param name="masks">Mask and defect images read.</param>
    /// <param name="made">Files made, by final name, the stack first.</param>
    /// <exception cref="StackIOException">The file cannot be written.</exception>
    public static void Write(
        string path, ProvenanceRecord record, RunPlan plan, IReadOnlyList<NamedDigest> others, IReadOnlyList<NamedDigest> masks, IReadOnlyList<NamedDigest> made)
    {
        string created = record.Created.UtcDateTime.ToString("yyyy-MM-dd'T'HH:mm:ss'Z'", CultureInfo.InvariantCulture);
        JsonObject entities = new()
        {
            ["stacks:source"] = FileEntity(record.SourceName, record.SourceDigest),
            [Recipe] = RecipeEntity(record, plan),
        };
        List<string> used = ["stacks:source", Recipe];
        for (int i = 0; i < others.Count; i++)
        {
            used.Add(Numbered("stacks:source", i + 1));
            entities[used[^1]] = FileEntity(others[i].Name, others[i].Digest);
        }

        string[] sources = [.. used.Where(e => e != Recipe)];
        for (int i = 0; i < masks.Count; i++)
        {
            used.Add(Numbered("stacks:mask", i));
            entities[used[^1]] = FileEntity(masks[i].Name, masks[i].Digest);
        }

        List<string> results = [];
        for (int i = 0; i < made.Count; i++)
        {
            results.Add(i == 0 ? Output : Numbered(Companion, i - 1));
            entities[results[^1]] = FileEntity(made[i].Name, made[i].Digest);
        }

        JsonObject agents = new() { ["stacks:software"] = Agent(record.Program, record.Version, null) };
        foreach (PluginOrigin origin in plan.FormatOrigins.Concat(plan.Steps.Select(s => s.Filter.Origin)))
            agents["stacks:plugin-" + origin.Assembly] = Agent(origin.Assembly, origin.Version, origin.Digest);

        JsonObject root = new()
        {
            ["prefix"] = new JsonObject { ["stacks"] = "urn:stacks:" },
            ["entity"] = entities,
            ["activity"] = new JsonObject { [Run] = Activity(record, created) },
            ["agent"] = agents,
            ["used"] = Relations("u", used.Select(e => new JsonObject { ["prov:activity"] = Run, ["prov:entity"] = e })),
            ["wasGeneratedBy"] = Relations(
                "g", results.Select(e => new JsonObject { ["prov:entity"] = e, ["prov:activity"] = Run, ["prov:time"] = created })),
            ["wasAssociatedWith"] = Relations(
                "a", agents.Select(a => new JsonObject { ["prov:activity"] = Run, ["prov:agent"] = a.Key, ["prov:plan"] = Recipe })),
            ["wasDerivedFrom"] = Relations(
                "d", results.SelectMany(e => sources.Select(s => new JsonObject { ["prov:generatedEntity"] = e, ["prov:usedEntity"] = s }))),
        };
        try
        {
            File.WriteAllText(path, root.ToJsonString(Indented) + "\n");
        }
        catch (Exception fault) when (fault is IOException or UnauthorizedAccessException)
        {
            throw new StackIOException(path, $"cannot be written ({fault.Message})", "check the folder and the space on its disk", fault);
        }
    }

    private static JsonObject FileEntity(string name, string digest) => new() { ["prov:label"] = name, ["stacks:sha256"] = digest };

    private static JsonObject RecipeEntity(ProvenanceRecord record, RunPlan plan)
    {
        // The digest is of the recipe as resolved, so that comments and layout of the file do not count.
        JsonObject entity = FileEntity(Path.GetFileName(plan.Recipe.Path), record.RecipeDigest);
        entity["prov:type"] = Name("prov:Plan");
        entity["stacks:title"] = record.RecipeTitle;
        return entity;
    }

    private static JsonObject Activity(ProvenanceRecord record, string created)
    {
        JsonObject run = new()
        {
            ["prov:endTime"] = created,
            ["stacks:workDigest"] = record.WorkDigest,
            ["stacks:frames"] = record.Totals.Frames,
            ["stacks:replacedBright"] = record.Totals.ReplacedBright,
            ["stacks:replacedDark"] = record.Totals.ReplacedDark,
            ["stacks:keptAsSource"] = record.Totals.KeptAsSource,
            ["stacks:saturated"] = record.Totals.Saturated,
            ["stacks:missing"] = record.Totals.Missing,
            ["stacks:fluxIn"] = Number(record.Totals.FluxIn),
            ["stacks:fluxRemoved"] = Number(record.Totals.FluxRemoved),
            ["stacks:fluxOut"] = Number(record.Totals.FluxOut),
        };
        for (int i = 0; i < record.Steps.Count; i++)
        {
            ProvenanceStep step = record.Steps[i];
            string key = Numbered("stacks:step", i);
            run[key] = step.Filter;
            run[key + ".plugin"] = $"{step.Plugin} {step.Version}";
            if (step.Channel is not null)
                run[key + ".channel"] = step.Channel;
            foreach (ResolvedParameter parameter in step.Parameters)
            {
                string name = $"{key}.{parameter.Name.Replace(' ', '_')}";
                run[name] = parameter.Value;
                if (parameter.Unit.Length > 0)
                    run[name + ".unit"] = parameter.Unit;
            }
        }

        if (record.Noise.Count > 0)
            run["stacks:noise"] = Texts(record.Noise);
        if (record.Remarks.Count > 0)
            run["stacks:remark"] = Texts(record.Remarks);
        return run;
    }

    private static JsonObject Agent(string name, string version, string? digest)
    {
        JsonObject agent = new() { ["prov:type"] = Name("prov:SoftwareAgent"), ["prov:label"] = name, ["stacks:version"] = version };
        if (digest is not null)
            agent["stacks:sha256"] = digest;
        return agent;
    }

    private static JsonObject Name(string name) => new() { ["$"] = name, ["type"] = "prov:QUALIFIED_NAME" };

    private static JsonObject Relations(string letter, IEnumerable<JsonObject> relations) =>
        new(relations.Select((relation, i) => KeyValuePair.Create<string, JsonNode?>(Numbered("_:" + letter, i), relation)));

    private static JsonArray Texts(IEnumerable<string> texts) => new([.. texts.Select(t => (JsonNode)t)]);

    /// <summary>JSON has no infinities and no NaN; they are written as text.</summary>
    private static JsonNode Number(double number) =>
        double.IsFinite(number) ? number : number.ToString(CultureInfo.InvariantCulture);

    private static string Numbered(string name, int index) => name + (index + 1).ToString(CultureInfo.InvariantCulture);
}
