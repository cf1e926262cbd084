using System.Numerics;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using System.Security.Cryptography;
using Stacks.Abstractions;
using Stacks.Filters.Ranks;
using Stacks.Imaging;
using Stacks.Tests.AdaptiveMedian;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Ranks;

/// <summary>
/// The same bits at every vector width: these tests run once more in a child process for each width this machine can be
/// limited to (DOTNET_EnableAVX512=0, DOTNET_EnableAVX2=0), which reports the width it ran at and the digest of its results.
/// </summary>
public class VectorWidthTests
{
    private const string ReportVariable = "STACKS_TEST_WIDTH_REPORT";

    [Fact]
    public void Results_have_one_digest()
    {
        string digest = Digest();
        Assert.Equal(digest, Digest());
        if (Environment.GetEnvironmentVariable(ReportVariable) is { Length: > 0 } report)
            File.WriteAllText(report, $"{LaneWidths.Widest} {digest}");
    }

    [Fact]
    public void The_widest_vectors_of_the_machine_are_in_use()
    {
        int bits = Vector512.IsHardwareAccelerated ? 512 : Vector256.IsHardwareAccelerated ? 256 : Vector128.IsHardwareAccelerated ? 128 : 0;
        Assert.Equal(bits, (int)LaneWidths.Widest);
    }

    [WiderThanFact(256)]
    public void Vectors_of_256_bits_give_the_same_bits() => CompareWithChild("DOTNET_EnableAVX512", 256);

    [WiderThanFact(128)]
    public void Vectors_of_128_bits_give_the_same_bits() => CompareWithChild("DOTNET_EnableAVX2", 128);

    private static void CompareWithChild(string limit, int bits)
    {
        using TemporaryFolder folder = new();
        string report = folder.File("report");
        ToolResult child = Tool.RunWith(
            new Dictionary<string, string> { [limit] = "0", [ReportVariable] = report },
            "dotnet",
            "vstest",
            typeof(VectorWidthTests).Assembly.Location,
            $"--TestCaseFilter:FullyQualifiedName={typeof(VectorWidthTests).FullName}.{nameof(Results_have_one_digest)}");
        Assert.True(child.ExitCode == 0, child.Output + child.Error);
        Assert.Equal($"Bits{bits} {Digest()}", File.ReadAllText(report));
    }

    private static string Digest()
    {
        using IncrementalHash hash = IncrementalHash.CreateHash(HashAlgorithmName.SHA256);
        Add<ushort>(hash);
        Add<short>(hash);
        Add<float>(hash);
        Add<double>(hash);
        return Convert.ToHexStringLower(hash.GetHashAndReset());
    }

    private static void Add<T>(IncrementalHash hash)
        where T : unmanaged, INumber<T>
    {
        RankFilter[] filters =
            [new MinimumFilter(), new MaximumFilter(), new MedianFilter(), new PercentileFilter(), new MidpointFilter(), new AlphaTrimmedMeanFilter()];
        foreach ((int width, int height) in new[] { (3, 5), (16, 9), (67, 20), (200, 12) })
        {
            foreach (double missing in new[] { 0, 0.03 })
            {
                RankScene<T> scene = new(width, height, width + height, missing, missing);
                foreach (RankFilter filter in filters)
                {
                    if (!filter.WorkTypes.Contains(FilterRun.LayoutOf(scene.Plane).WorkType))
                        continue;
                    List<(string, ParameterValue)> given = [("window", ParameterValue.Of(5))];
                    if (filter is PercentileFilter)
                        given.Add(("percentile", ParameterValue.Of(33)));
                    hash.AppendData(MemoryMarshal.AsBytes(
                        FilterRun.Smooth(FilterRun.Prepare(filter, scene.Plane, [.. given]), scene.Plane, scene.Flags).Samples));
                }

                (T[] output, SampleFlags[] flags) = Cleaning.Run(
                    scene.Plane.Buffer, scene.Flags.Buffer, width, height, LinearNoise.Constant(500), new OracleRules(3, 1, 7, 1.5, "both", 0));
                hash.AppendData(MemoryMarshal.AsBytes(output.AsSpan()));
                hash.AppendData(MemoryMarshal.AsBytes(flags.AsSpan()));
            }
        }
    }
}

/// <summary>A fact that is skipped by name where the machine has no wider vectors that could be turned off.</summary>
[AttributeUsage(AttributeTargets.Method)]
internal sealed class WiderThanFactAttribute : FactAttribute
{
    public WiderThanFactAttribute(int bits) =>
        Skip = RuntimeInformation.ProcessArchitecture == Architecture.X64 && (int)LaneWidths.Widest > bits
            ? null
            : $"x64 vectors of more than {bits} bits are not here";
}
