using BenchmarkDotNet.Configs;
using BenchmarkDotNet.Jobs;
using BenchmarkDotNet.Running;
using BenchmarkDotNet.Toolchains.InProcess.Emit;
using Stacks.Benchmarks;

(string Name, Func<Scene, IEnumerable<Ratio>> Rows)[] groups =
[
    ("formats", FormatRatios.Of),
    ("ranks", RankRatios.Of),
    ("pipeline", PipelineRatios.Of),
    ("local-statistics", LocalStatisticsRatios.Of),
    ("bilateral", BilateralRatios.Of),
    ("fast-bilateral", FastBilateralRatios.Of),
];

switch (args)
{
    case ["tables", .. string[] filters]:
        IConfig config = DefaultConfig.Instance.AddJob(Job.ShortRun.WithToolchain(InProcessEmitToolchain.Instance));
        BenchmarkSwitcher.FromTypes([typeof(KernelTables)]).Run(filters.Length == 0 ? ["--filter", "*"] : filters, config);
        return 0;
    case ["ratios"]:
        return Ratios(null, null);
    case ["ratios", "--record", string file]:
        return Ratios(null, file);
    case ["ratios", string name] when !name.StartsWith('-'):
        return Ratios(name, null);
    case ["ratios", string name, "--record", string file]:
        return Ratios(name, file);
    default:
        Console.Error.WriteLine("usage: dotnet run -c Release --project tests/Stacks.Benchmarks -- ratios [NAME] [--record FILE] | tables [--filter PATTERN]");
        return 64;
}

// Rows of the groups whose name contains the part; to the console as they come, and into a file with what they were measured on.
int Ratios(string? part, string? file)
{
    using Scene scene = new();
    List<string> lines = ["name\tours\treference\tratio\tgoal\tresult"];
    Console.WriteLine(lines[0]);
    foreach ((string name, Func<Scene, IEnumerable<Ratio>> rows) in groups)
    {
        if (part is not null && !name.Contains(part, StringComparison.Ordinal))
            continue;
        foreach (Ratio ratio in rows(scene))
        {
            lines.Add(ratio.ToString());
            Console.WriteLine(lines[^1]);
        }
    }

    if (file is not null)
        File.WriteAllLines(file, [.. Surroundings.Describe(), .. lines]);
    return 0;
}
