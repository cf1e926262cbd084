using Stacks.Pipeline;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>The whole host on a sample stack, selective and smoothing steps together.</summary>
public class WorkersTests
{
    [Fact]
    public void One_two_and_five_workers_write_the_same_bytes()
    {
        using TemporaryFolder folder = new();
        string samples = Path.Combine(Checkout.Root, "sample-stacks");
        Dictionary<string, string> environment = new() { ["SOURCE_DATE_EPOCH"] = "1700000000" };
        string[] digests = [.. new[] { "1", "2", "5" }.Select(workers =>
        {
            string output = folder.File(workers);
            ToolResult run = Tool.RunWith(
                environment, "dotnet", Checkout.Host, "run", Path.Combine(samples, "four-chips.recipe.toml"), Path.Combine(samples, "four-chips.fits"), "-o", output, "--workers", workers);
            Assert.True(run.ExitCode == 0, run.Error);
            return Digests.OfFile(Path.Combine(output, "four-chips.fits"), default) + Digests.OfFile(Path.Combine(output, "four-chips.fits.prov.json"), default);
        })];
        Assert.Equal(digests[0], digests[1]);
        Assert.Equal(digests[0], digests[2]);
    }
}
