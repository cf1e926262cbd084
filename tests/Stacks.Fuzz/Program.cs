using SharpFuzz;
using Stacks.Fuzz;

switch (args)
{
    case ["targets"]:
        foreach (string name in Targets.All.Keys)
            Console.WriteLine(name);
        return 0;
    case ["seeds", var name, var folder] when Targets.All.ContainsKey(name):
        Directory.CreateDirectory(folder);
        int number = 0;
        foreach (byte[] seed in Seeds.Of(name))
            File.WriteAllBytes(Path.Combine(folder, $"seed-{number++}"), seed);
        return 0;
    case ["instrument", .. var assemblies] when assemblies.Length > 0:
        foreach (string assembly in assemblies)
            Console.WriteLine($"{assembly}: {Fuzzer.Instrument(assembly, _ => true, Options.Value).Count()} types");
        return 0;
    case ["fuzz", var name] when Targets.All.TryGetValue(name, out Action<byte[]>? target):
        Fuzzer.Run(stream =>
        {
            using MemoryStream bytes = new();
            stream.CopyTo(bytes);
            target(bytes.ToArray());
        });
        return 0;
    case ["replay", var name, .. var files] when Targets.All.TryGetValue(name, out Action<byte[]>? target):
        foreach (string file in files)
            target(File.ReadAllBytes(file));
        return 0;
    default:
        Console.Error.WriteLine("usage: targets | seeds TARGET FOLDER | instrument ASSEMBLY... | fuzz TARGET (under afl-fuzz) | replay TARGET FILE...");
        return 64;
}
