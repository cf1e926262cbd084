using Stacks.Benchmarks;

if (args is not ["ratios"])
{
    Console.Error.WriteLine("usage: dotnet run -c Release --project tests/Stacks.Benchmarks -- ratios");
    return 64;
}

using Scene scene = new();
Console.WriteLine("name\tours\treference\tratio\tgoal\tresult");
foreach (Func<Scene, IEnumerable<Ratio>> group in new[] { FormatRatios.Of })
{
    foreach (Ratio ratio in group(scene))
        Console.WriteLine(ratio);
}

return 0;
