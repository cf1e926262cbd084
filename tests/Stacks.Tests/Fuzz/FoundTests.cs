using Stacks.Fuzz;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fuzz;

/// <summary>What the fuzzer once found stays mended: every file in tests/Stacks.Fuzz/found through its target.</summary>
public class FoundTests
{
    private static string Folder => Path.Combine(Checkout.Root, "tests", "Stacks.Fuzz", "found");

    [Fact]
    public void Everything_found_is_mended()
    {
        foreach (string file in Directory.Exists(Folder) ? Directory.GetFiles(Folder).Order(StringComparer.Ordinal) : Enumerable.Empty<string>())
        {
            string name = Path.GetFileName(file);
            Targets.All[name[..name.LastIndexOf('-')]](File.ReadAllBytes(file));
        }
    }

    /// <summary>A target that let every exception pass would find nothing.</summary>
    [Fact]
    public void A_target_lets_faults_through()
    {
        Assert.ThrowsAny<Exception>(() => Targets.All["fits-header"](null!));
        foreach ((string name, Action<byte[]> target) in Targets.All)
        {
            target([]);
            target([1, 2, 3]);
            Assert.DoesNotContain('/', name);
        }
    }
}
