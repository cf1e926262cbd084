using Stacks.Abstractions;
using Stacks.Pipeline;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Provenance;

/// <summary>The sidecar as python3-prov reads it, an independent implementation of W3C PROV.</summary>
public class ProvJsonTests
{
    private const string Script = """
        import sys, prov.model as m
        d = m.ProvDocument.deserialize(sys.argv[1], format='json')
        def name(x): return str(x)
        def rel(cls): return sorted(tuple(str(v) for k, v in r.formal_attributes if v is not None) for r in d.get_records(cls))
        ns = {n.prefix: n.uri for n in d.namespaces}
        print('namespace', ns['stacks'])
        for e in sorted(d.get_records(m.ProvEntity), key=lambda r: str(r.identifier)):
            a = dict((str(k), str(v)) for k, v in e.attributes)
            print('entity', e.identifier, a['prov:label'], a['stacks:sha256'], a.get('prov:type', '-'))
        for e in d.get_records(m.ProvActivity):
            a = dict((str(k), str(v)) for k, v in e.attributes)
            print('activity', e.identifier, a['stacks:step1'], a['stacks:step1.width'], a['stacks:step1.width.unit'], a['stacks:fluxRemoved'], e.get_endTime().isoformat())
            print('remarks', len(e.get_attribute('stacks:remark')))
        for e in sorted(d.get_records(m.ProvAgent), key=lambda r: str(r.identifier)):
            print('agent', e.identifier, sorted(map(str, e.get_attribute('prov:type'))))
        for cls in (m.ProvUsage, m.ProvGeneration, m.ProvAssociation, m.ProvDerivation):
            for r in rel(cls): print(cls.__name__, *r)
        """;

    [NeedsFact(Needs.Prov)]
    public void Python_prov_reads_the_entities_the_activity_and_who_made_what()
    {
        using TemporaryFolder folder = new();
        ProvenanceRecord record = new()
        {
            Program = "stacks",
            Version = "0.1.0",
            Created = DateTimeOffset.FromUnixTimeSeconds(1700000000),
            RecipeTitle = "Night, red \"R\" µ",
            RecipeDigest = "aa",
            WorkDigest = "bb",
            SourceName = "in.fits",
            SourceDigest = "cc",
            Steps = [new ProvenanceStep("smooth", "Fakes", "1.2", "f1", null, [new ResolvedParameter("width", "3", "px")])],
            Noise = ["recipe: sigma 3"],
            Totals = new RunTotals(2, 1, 0, 0, 0, 0, 10, double.NaN, 10),
            Remarks = ["one", "two"],
        };
        RunPlan plan = ProvenancePlan.Of(folder.File("recipe.toml"));
        Sidecar.Write(folder.File("s.json"), record, plan, [new NamedDigest("second.tif", "cc")], [new NamedDigest("bad.fits", "dd")], [new NamedDigest("out.fits", "ee"), new NamedDigest("out.mask.fits", "ff")]);
        ToolResult result = Tool.Run(Tool.Python, "-c", Script, folder.File("s.json"));
        Assert.Equal("", result.Error);
        Assert.Equal(
            [
                "namespace urn:stacks:",
                "entity stacks:companion1 out.mask.fits ff -",
                "entity stacks:mask1 bad.fits dd -",
                "entity stacks:output out.fits ee -",
                "entity stacks:recipe recipe.toml aa prov:Plan",
                "entity stacks:source in.fits cc -",
                "entity stacks:source2 second.tif cc -",
                "activity stacks:run smooth 3 px NaN 2023-11-14T22:13:20+00:00",
                "remarks 2",
                "agent stacks:plugin-Memory ['prov:SoftwareAgent']",
                "agent stacks:software ['prov:SoftwareAgent']",
                "ProvUsage stacks:run stacks:mask1",
                "ProvUsage stacks:run stacks:recipe",
                "ProvUsage stacks:run stacks:source",
                "ProvUsage stacks:run stacks:source2",
                "ProvGeneration stacks:companion1 stacks:run 2023-11-14 22:13:20+00:00",
                "ProvGeneration stacks:output stacks:run 2023-11-14 22:13:20+00:00",
                "ProvAssociation stacks:run stacks:plugin-Memory stacks:recipe",
                "ProvAssociation stacks:run stacks:software stacks:recipe",
                "ProvDerivation stacks:companion1 stacks:source",
                "ProvDerivation stacks:companion1 stacks:source2",
                "ProvDerivation stacks:output stacks:source",
                "ProvDerivation stacks:output stacks:source2",
            ],
            result.Output.TrimEnd().Split('\n'));
    }
}
