using Stacks.Tests.Catalogue;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Cli;

/// <summary>A folder with stacks and recipes, and the built host run over them as a process of its own.</summary>
internal sealed class CliBench : IDisposable
{
    public const int Width = 8;
    public const int Height = 6;
    public const int Frames = 4;

    private readonly TemporaryFolder folder = new();

    public string Folder => folder.Path;

    public string Out => folder.File("out");

    public static int Sample(int x, int y, int frame) => 1000 + (100 * frame) + (10 * y) + x;

    public string File(string name) => folder.File(name);

    public string Put(string name, byte[] content)
    {
        Directory.CreateDirectory(Path.GetDirectoryName(File(name))!);
        System.IO.File.WriteAllBytes(File(name), content);
        return File(name);
    }

    public string Put(string name, string content) => Put(name, System.Text.Encoding.UTF8.GetBytes(content));

    /// <summary>A good stack.</summary>
    public string Stack(string name) => Put(name, SmallFiles.Fits(Width, Height, Frames, Sample));

    /// <summary>A recipe.</summary>
    public string Recipe(string text = "title = \"Nothing\"\n") => Put("r.toml", text);

    public ToolResult Run(params string[] arguments) => Tool.Stacks(["run", .. arguments, "-o", Out, "--plugins", PluginCatalogueTests.PluginFolder]);

    /// <summary>A fault as the user must see it: one line that says where, what and what to do, an exit code, nothing written.</summary>
    public void Refused(ToolResult result, int exitCode, params string[] says)
    {
        Assert.Equal(exitCode, result.ExitCode);
        string line = Assert.Single(result.Error.TrimEnd('\n').Split('\n'));
        Assert.StartsWith("stacks: ", line, StringComparison.Ordinal);
        Assert.Contains("; ", line, StringComparison.Ordinal);
        foreach (string text in says)
            Assert.Contains(text, line, StringComparison.Ordinal);
        Assert.DoesNotContain("   at ", result.Error + result.Output, StringComparison.Ordinal);
        Assert.DoesNotContain("Exception", result.Error + result.Output, StringComparison.Ordinal);
        if (Directory.Exists(Out))
            Assert.Empty(Directory.GetFiles(Out));
    }

    public void Dispose() => folder.Dispose();
}
