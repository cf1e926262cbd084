using Stacks.Abstractions;
using Stacks.Pipeline;
using Stacks.Tests.Engine;
using Xunit;

namespace Stacks.Tests.Provenance;

public class ProvenanceTests
{
    private static readonly FrameLayout Row = new() { Width = 3, Height = 1, SampleType = SampleType.UInt16 };

    private static readonly ParameterSpec Threshold = new()
    {
        Name = "threshold",
        Kind = ParameterKind.Number,
        Unit = "noise sigmas",
        Default = ParameterValue.Of(5),
        Meaning = "m",
        WhenRaised = "r",
        WhenLowered = "l",
    };

    [Fact]
    public void The_record_tells_steps_totals_and_digests()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row, 1, 200, 3).Add<ushort>(Row with { Width = 1, Height = 3 }, 4, 500, 6);
        FakeFilter cap = new("cap", FilterKind.Selective, (input, flags, output, context) =>
        {
            flags.Samples[1] |= SampleFlags.ReplacedBright;
            output[1] = 10;
            context.Report!("threshold", context.FrameIndex + 0.5);
        })
        { Parameters = [Threshold] };
        MemoryWriter written = bench.Run(bench.Plan(cap));
        ProvenanceRecord record = written.Provenance!;
        Assert.Equal(("stacks", Software.Version, "Test", "cap-digest"), (record.Program, record.Version, record.RecipeTitle, record.RecipeDigest));
        Assert.Equal(("in.mem", Digests.OfFile(bench.Source.Path, default)), (record.SourceName, record.SourceDigest));
        Assert.Equal(new RunTotals(2, 2, 0, 0, 0, 0, 714, 680, 34), record.Totals);
        ProvenanceStep step = Assert.Single(record.Steps);
        Assert.Equal(("cap", "Fakes", "1.2", "f1"), (step.Filter, step.Plugin, step.Version, step.PluginDigest));
        Assert.Equal(
            [new ResolvedParameter("width", "3 | 1", "px"), new ResolvedParameter("threshold on the frames", "0.5 to 1.5", "noise sigmas")],
            step.Parameters);
        Assert.Empty(record.Remarks);
    }

    [Fact]
    public void The_ledger_tells_each_frames_digests_level_and_flux()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row, 1, 200, 3).Add<ushort>(Row, 4, 5, 6);
        MemoryWriter written = bench.Run(bench.Plan(FakeFilter.Cap(100, 2)));
        for (int f = 0; f < 2; f++)
        {
            LedgerRow row = written.Ledger[f];
            Assert.Equal(f, row.Frame);
            Assert.Equal(System.Security.Cryptography.SHA256.HashData(bench.Source.Stored(f)), row.SourceDigest);
            Assert.Equal(System.Security.Cryptography.SHA256.HashData(written.Frames[f]), row.ResultDigest);
        }

        Assert.NotEqual(written.Ledger[0].SourceDigest, written.Ledger[0].ResultDigest);
        Assert.Equal((3, 5), (written.Ledger[0].Level, written.Ledger[1].Level));
        Assert.Equal((204, 198, 6), (written.Ledger[0].FluxIn, written.Ledger[0].FluxRemoved, written.Ledger[0].FluxOut));
        Assert.Equal((15, 0, 15), (written.Ledger[1].FluxIn, written.Ledger[1].FluxRemoved, written.Ledger[1].FluxOut));
    }

    [Fact]
    public void Flux_is_accounted_for_to_the_last_unit_in_64_bit_integers_and_to_rounding_in_floats()
    {
        using Bench bench = new();
        FrameLayout wide = Row with { SampleType = SampleType.Int64 };
        bench.Source.Add(wide, (1L << 53) + 1, 1L << 61, -(1L << 53));
        const int Side = 1000;
        Random random = new(4);
        float[] samples = [.. Enumerable.Range(0, Side * Side).Select(_ => 1e6f + random.NextSingle())];
        double removed = 0;
        for (int i = 0; i < samples.Length; i += 997)
        {
            samples[i] += 3e6f;
            removed += samples[i] - 1e6;
        }

        bench.Source.Add(new FrameLayout { Width = Side, Height = Side, SampleType = SampleType.Float32 }, samples);
        FakeFilter cap = new("cap", FilterKind.Selective, (input, flags, output, context) =>
        {
            for (int i = 0; i < input.Length; i++)
            {
                if (input[i] > (context.FrameIndex == 0 ? 1e18 : 2e6))
                {
                    flags.Samples[i] |= SampleFlags.ReplacedBright;
                    output[i] = 1e6;
                }
            }
        });
        MemoryWriter written = bench.Run(bench.Plan(cap));
        Assert.Equal((double)((1L << 61) - 1000000), written.Ledger[0].FluxRemoved);
        Assert.Equal(1000001, written.Ledger[0].FluxOut);
        Assert.Equal(removed, written.Ledger[1].FluxRemoved, 1e-15 * written.Ledger[1].FluxIn);
    }

    [Fact]
    public void Smoothing_is_remarked_upon()
    {
        using Bench bench = new();
        bench.Source.Add<ushort>(Row, 1, 2, 3);
        IReadOnlyList<string> remarks = bench.Run(bench.Plan(FakeFilter.Scale(1, 0))).Provenance!.Remarks;
        Assert.Contains(remarks, r => r.Contains("gain and read noise", StringComparison.Ordinal));
        Assert.Contains(remarks, r => r.Contains("moves flux", StringComparison.Ordinal));
    }
}

/// <summary>Tests that set SOURCE_DATE_EPOCH run alone.</summary>
[Collection(AloneCollection.Name)]
public class SourceDateEpochTests
{
    private static string Sidecar(string? epoch)
    {
        string? old = Environment.GetEnvironmentVariable("SOURCE_DATE_EPOCH");
        Environment.SetEnvironmentVariable("SOURCE_DATE_EPOCH", epoch);
        try
        {
            using Bench bench = new();
            for (int f = 0; f < 20; f++)
                bench.Source.Add<ushort>(new FrameLayout { Width = 3, Height = 1, SampleType = SampleType.UInt16 }, 1, 200, 3);
            bench.Run(bench.Plan(FakeFilter.Cap(100, 2)) with { Workers = 4 });
            string text = File.ReadAllText(bench.Output + ".prov.json");
            Assert.DoesNotContain(bench.Folder, text, StringComparison.Ordinal);
            return text;
        }
        finally
        {
            Environment.SetEnvironmentVariable("SOURCE_DATE_EPOCH", old);
        }
    }

    [Fact]
    public void Two_runs_give_the_same_bytes_and_the_stamp_is_the_epochs()
    {
        // 1700000000 s after 1970-01-01 is 2023-11-14T22:13:20Z (date -u -d @1700000000).
        string first = Sidecar("1700000000");
        Assert.Equal(first, Sidecar("1700000000"));
        Assert.Contains("\"prov:endTime\": \"2023-11-14T22:13:20Z\"", first, StringComparison.Ordinal);
        Assert.DoesNotContain("2023-11-14", Sidecar(null), StringComparison.Ordinal);
        Assert.DoesNotContain("2023-11-14", Sidecar("yesterday"), StringComparison.Ordinal);
    }
}
