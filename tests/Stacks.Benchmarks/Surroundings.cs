using System.Globalization;
using System.Reflection;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using OpenCvSharp;
using Stacks.TestSupport;

namespace Stacks.Benchmarks;

/// <summary>What figures were measured on and with: the header of a result file. No name of a host is in it.</summary>
internal static class Surroundings
{
    /// <summary>Lines <c># WHAT: TEXT</c>.</summary>
    public static IEnumerable<string> Describe()
    {
        yield return string.Create(CultureInfo.InvariantCulture, $"# date: {DateTime.UtcNow:yyyy-MM-dd}");
        yield return $"# machine: {Machine()}";
        yield return $"# runtime: {RuntimeInformation.FrameworkDescription}, {RuntimeInformation.ProcessArchitecture}, vectors to {(Vector512.IsHardwareAccelerated ? 512 : Vector256.IsHardwareAccelerated ? 256 : 128)} bits";
        List<string> references = [$"LibTiff.NET {Version(typeof(BitMiracle.LibTiff.Classic.Tiff))}"];
        if (OpenCv.Missing is null)
            references.Add($"OpenCV {Cv2.GetVersionString()} (OpenCvSharp4 {Version(typeof(Cv2))})");
        if (Scipy.Missing is null)
            references.Add(Tool.Run(Tool.Python, "-c", "import scipy, numpy, sys; print(f'scipy {scipy.__version__} (numpy {numpy.__version__}, Python {sys.version.split()[0]})')").Output.Trim());
        if (Needs.Missing(["funpack"]) is null)
            references.Add($"funpack of cfitsio {Tool.Run("funpack", "-V").Output.Split("version", StringSplitOptions.TrimEntries)[^1]}");
        yield return $"# references: {string.Join("; ", references)}";
    }

    private static string Machine()
    {
        if (Needs.Missing(["lscpu"]) is not null)
            return $"{Environment.ProcessorCount} processors, {RuntimeInformation.OSDescription}";
        Dictionary<string, string> told = Tool.RunWith(new Dictionary<string, string> { ["LC_ALL"] = "C" }, "lscpu").Output.Split('\n')
            .Select(line => line.Split(':', 2, StringSplitOptions.TrimEntries))
            .Where(parts => parts.Length == 2)
            .GroupBy(parts => parts[0])
            .ToDictionary(same => same.Key, same => same.First()[1]);
        return $"{told["Model name"]} (family {told["CPU family"]}, model {told["Model"]}), {told["CPU(s)"]} CPUs";
    }

    private static string Version(Type type) =>
        type.Assembly.GetCustomAttribute<AssemblyInformationalVersionAttribute>()?.InformationalVersion.Split('+')[0] ?? type.Assembly.GetName().Version!.ToString();
}
