using Stacks.Abstractions;
using Stacks.Pipeline;
using Stacks.Tests.Engine;
using Xunit;

namespace Stacks.Tests.Plans;

/// <summary>Equal work has equal digests however it is written down; any change of the work changes the digest.</summary>
public sealed class RecipeDigestTests : IDisposable
{
    private const string Base = "[noise]\nfrom = \"values\"\ngain = 2\nread_noise = 4\npedestal = 100\n[[step]]\nfilter = \"tuned\"\nthreshold = 5\n[output]\nsamples = \"same\"\n";

    private readonly PlanBench bench = new();

    public RecipeDigestTests()
    {
        ParameterSpec spec = new()
        {
            Name = "threshold",
            Kind = ParameterKind.Number,
            Default = ParameterValue.Of(5.0),
            Meaning = "How far off",
            WhenRaised = "fewer",
            WhenLowered = "more",
        };
        bench.Filters.Add(new FakeFilter("tuned", FilterKind.Selective, (_, _, _, _) => { }) { Parameters = [spec, spec with { Name = "other" }] });
        bench.Put("m1.cell", "cell 1");
        bench.Put("m2.cell", "cell 2");
        bench.Put("m3.cell", "cell 1");
    }

    public void Dispose() => bench.Dispose();

    [Theory]
    [InlineData("# a comment\ntitle = \"Another title\"\n" + Base)]
    [InlineData("output = { samples = \"same\" }\n[noise]\npedestal = 100.0\nread_noise = 4.0\ngain = 2.0\nfrom = \"values\"\n[[step]]\nthreshold = 5.0\nfilter = \"tuned\"\n")]
    [InlineData("[noise]\nfrom = \"values\"\ngain = 2\nread_noise = 4\npedestal = 100\n[[step]]\nfilter = \"tuned\"\n[output]\nsamples = \"same\"\nformat = \"same\"\ncompression = \"none\"\n")]
    public void Same_work(string text) => Assert.Equal(Digest(Base), Digest(text));

    [Theory]
    [InlineData("threshold = 5", "threshold = 6")]
    [InlineData("threshold = 5", "other = 6")]
    [InlineData("threshold = 5", "channel = 0")]
    [InlineData("gain = 2", "gain = 2.1")]
    [InlineData("read_noise = 4", "read_noise = 4.1")]
    [InlineData("pedestal = 100", "pedestal = 101")]
    [InlineData("pedestal = 100", "pedestal = 100\nchannel = 0")]
    [InlineData("samples = \"same\"", "samples = \"auto\"")]
    [InlineData("samples = \"same\"", "samples = \"same\"\nformat = \"cell\"")]
    [InlineData("samples = \"same\"", "samples = \"same\"\ncompression = \"lossless\"")]
    [InlineData("samples = \"same\"", "samples = \"same\"\nmask = false")]
    [InlineData("[noise]", "[input]\nmosaic = \"none\"\n[noise]")]
    [InlineData("[noise]", "[input]\nmosaic = \"2x2\"\n[noise]")]
    [InlineData("[noise]", "[input]\nsaturation = 60000\n[noise]")]
    [InlineData("[noise]", "[input]\nextensions = [\"SCI\"]\n[noise]")]
    [InlineData("[noise]", "[input]\nmask = \"m1.cell\"\n[noise]")]
    [InlineData("[noise]", "[input]\ndefects = \"m1.cell\"\n[noise]")]
    [InlineData("[output]", "[[step]]\nfilter = \"tuned\"\n[output]")]
    public void Other_work(string from, string to) =>
        Assert.NotEqual(Digest(Base), Digest(Base.Replace(from, to, StringComparison.Ordinal)));

    [Fact]
    public void Masks_count_by_their_content()
    {
        string Mask(string name) => Digest(Base.Replace("[noise]", $"[input]\nmask = \"{name}\"\n[noise]", StringComparison.Ordinal));

        Assert.NotEqual(Mask("m1.cell"), Mask("m2.cell"));
        Assert.Equal(Mask("m1.cell"), Mask("m3.cell"));
    }

    [Fact]
    public void Digest_is_lower_case_hex() => Assert.Matches("^[0-9a-f]{64}$", Digest(Base));

    private string Digest(string text)
    {
        Recipe recipe = bench.Recipe(text);
        return RecipeDigest.Of(recipe, StepBinder.Bind(recipe, bench.Catalogue));
    }
}
