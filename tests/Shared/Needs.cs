using System.Diagnostics;
using Xunit;

namespace Stacks.TestSupport;

/// <summary>A fact that is skipped by name where something it needs is absent; see <see cref="Needs"/> for the names.</summary>
[AttributeUsage(AttributeTargets.Method)]
public sealed class NeedsFactAttribute : FactAttribute
{
    public NeedsFactAttribute(params string[] needs) => Skip = Needs.Missing(needs);
}

/// <summary>A theory that is skipped by name where something it needs is absent.</summary>
[AttributeUsage(AttributeTargets.Method)]
public sealed class NeedsTheoryAttribute : TheoryAttribute
{
    public NeedsTheoryAttribute(params string[] needs) => Skip = Needs.Missing(needs);
}

/// <summary>
/// What a test may need: <c>real-data</c>, <c>python:MODULE</c> (of Debian's /usr/bin/python3), or the name of a command.
/// </summary>
public static class Needs
{
    public const string RealDataNeed = "real-data";
    public const string Astropy = "python:astropy";
    public const string Scipy = "python:scipy";
    public const string Tifffile = "python:tifffile";
    public const string Prov = "python:prov";

    private static readonly Dictionary<string, bool> Known = [];

    /// <summary>The reason to skip, or null when all is there.</summary>
    public static string? Missing(string[] needs)
    {
        foreach (string need in needs)
        {
            bool there;
            lock (Known)
            {
                if (!Known.TryGetValue(need, out there))
                    Known[need] = there = Look(need);
            }

            if (!there)
                return $"{need} is not here";
        }

        return null;
    }

    private static bool Look(string need)
    {
        if (need == RealDataNeed)
            return RealData.Folder is not null;
        if (need.StartsWith("python:", StringComparison.Ordinal))
            return File.Exists(Tool.Python) && Tool.Run(Tool.Python, "-c", "import " + need["python:".Length..]).ExitCode == 0;
        return (Environment.GetEnvironmentVariable("PATH") ?? "").Split(':').Any(f => f.Length > 0 && File.Exists(Path.Combine(f, need)));
    }
}

/// <summary>The folder of real stacks: STACKS_REAL_DATA, or shared/data beside the checkout.</summary>
public static class RealData
{
    public static string? Folder { get; } = Find();

    public static string File(params string[] parts) => Path.Combine([Folder ?? throw new InvalidOperationException("no real data"), .. parts]);

    private static string? Find()
    {
        string? named = Environment.GetEnvironmentVariable("STACKS_REAL_DATA");
        if (!string.IsNullOrEmpty(named))
            return Directory.Exists(named) ? named : null;
        string beside = Path.Combine(Checkout.Root, "..", "shared", "data");
        return Directory.Exists(beside) ? Path.GetFullPath(beside) : null;
    }
}

/// <summary>Places in the checkout.</summary>
public static class Checkout
{
    public static string Root { get; } = FindRoot();

    /// <summary>The built host of the same configuration as the tests.</summary>
    public static string Host { get; } = Path.Combine(
        Root, "src", "Stacks.Cli", "bin", AppContext.BaseDirectory.Contains("/Debug/", StringComparison.Ordinal) ? "Debug" : "Release", "net10.0", "stacks.dll");

    private static string FindRoot()
    {
        string? folder = AppContext.BaseDirectory;
        while (folder is not null && !System.IO.File.Exists(Path.Combine(folder, "Stacks.sln")))
            folder = Path.GetDirectoryName(folder);
        return folder ?? throw new InvalidOperationException("Stacks.sln not found above the tests");
    }
}

/// <summary>What a command printed and how it ended.</summary>
public sealed record ToolResult(int ExitCode, string Output, string Error);

/// <summary>Runs commands.</summary>
public static class Tool
{
    public const string Python = "/usr/bin/python3";

    public static ToolResult Run(string command, params string[] arguments) => RunWith(new Dictionary<string, string>(), command, arguments);

    /// <summary>Runs the built host.</summary>
    public static ToolResult Stacks(params string[] arguments) => Run("dotnet", [Checkout.Host, .. arguments]);

    public static ToolResult RunWith(IReadOnlyDictionary<string, string> environment, string command, params string[] arguments)
    {
        ProcessStartInfo start = new(command, arguments) { RedirectStandardOutput = true, RedirectStandardError = true };
        foreach ((string name, string value) in environment)
            start.Environment[name] = value;
        using Process process = Process.Start(start)!;
        Task<string> error = process.StandardError.ReadToEndAsync();
        string output = process.StandardOutput.ReadToEnd();
        process.WaitForExit();
        return new ToolResult(process.ExitCode, output, error.Result);
    }
}

/// <summary>A folder that is removed at the end of a test.</summary>
public sealed class TemporaryFolder : IDisposable
{
    public string Path { get; } = Directory.CreateTempSubdirectory("stacks-test-").FullName;

    public string File(string name) => System.IO.Path.Combine(Path, name);

    public void Dispose() => Directory.Delete(Path, recursive: true);
}
