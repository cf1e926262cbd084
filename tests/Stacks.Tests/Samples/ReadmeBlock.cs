using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Samples;

/// <summary>
/// A block of README.md between <c>&lt;!-- NAME: begin --&gt;</c> and <c>&lt;!-- NAME: end --&gt;</c>. With
/// STACKS_WRITE_README=1 it is written instead of compared.
/// </summary>
internal static class ReadmeBlock
{
    private static readonly Lock Gate = new();

    /// <summary>The block equals what was made now.</summary>
    public static void AssertIs(string name, string made)
    {
        lock (Gate)
        {
            string path = Path.Combine(Checkout.Root, "README.md"), begin = $"<!-- {name}: begin -->\n", end = $"\n<!-- {name}: end -->";
            string readme = File.ReadAllText(path);
            int from = readme.IndexOf(begin, StringComparison.Ordinal) + begin.Length, to = readme.IndexOf(end, StringComparison.Ordinal);
            Assert.True(to >= from, $"README.md has no block {name}");
            if (Environment.GetEnvironmentVariable("STACKS_WRITE_README") == "1")
                File.WriteAllText(path, readme[..from] + made + readme[to..]);
            else
                Assert.True(made == readme[from..to], $"block {name} of README.md is not what is made now; STACKS_WRITE_README=1 dotnet test writes it:\n{made}");
        }
    }
}
