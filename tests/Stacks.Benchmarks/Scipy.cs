using System.Globalization;
using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.TestSupport;

namespace Stacks.Benchmarks;

/// <summary>Times of scipy.ndimage through Debian's Python, each taken once: it takes seconds where we take milliseconds.</summary>
internal static class Scipy
{
    private const string Script = """
        import sys, time
        import numpy
        from scipy import ndimage
        path, kind, width, expression = sys.argv[1:5]
        a = numpy.fromfile(path, dtype=kind).reshape(-1, int(width))
        work = compile(expression, "expression", "eval")
        start = time.perf_counter()
        eval(work)
        print((time.perf_counter() - start) / a.size)
        """;

    /// <summary>Why it is not here; null when it is.</summary>
    public static string? Missing { get; } = Needs.Missing([Needs.Scipy]);

    /// <summary>Seconds that an expression takes for a sample, measured on a plane.</summary>
    /// <param name="scene">Gives a file for the samples.</param>
    /// <param name="plane">The array <c>a</c> of the expression; a crop of the scene where the expression is slow.</param>
    /// <param name="expression">Such as <c>ndimage.median_filter(a, 9, mode="reflect")</c>.</param>
    public static double SecondsPerSample<T>(Scene scene, Plane<T> plane, string expression)
        where T : unmanaged
    {
        string path = scene.File("scipy.raw");
        File.WriteAllBytes(path, MemoryMarshal.AsBytes(plane.Samples));
        string kind = default(T) switch { ushort => "<u2", short => "<i2", float => "<f4", _ => throw new NotSupportedException(typeof(T).Name) };
        ToolResult result = Tool.Run(Tool.Python, "-c", Script, path, kind, plane.Width.ToString(CultureInfo.InvariantCulture), expression);
        return result.ExitCode == 0
            ? double.Parse(result.Output, CultureInfo.InvariantCulture)
            : throw new InvalidOperationException(result.Error);
    }

    /// <summary>Seconds for a whole frame, scaled by pixels from its middle of so many pixels a side: say so in the row's name.</summary>
    public static double SecondsPerFrame<T>(Scene scene, int crop, string expression)
        where T : unmanaged => SecondsPerSample(scene, scene.Crop<T>(crop), expression) * Scene.Side * Scene.Side;
}
