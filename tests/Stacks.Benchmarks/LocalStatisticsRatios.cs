using Stacks.Abstractions;
using Stacks.Filters.LocalStatistics;

namespace Stacks.Benchmarks;

/// <summary>Local statistics against a copy of the frame, and wide windows against narrow ones.</summary>
internal static class LocalStatisticsRatios
{
    /// <summary>The rows.</summary>
    public static IEnumerable<Ratio> Of(Scene scene)
    {
        Plane<float> input = scene.Plane<float>();
        Action copy = Copy(input);
        foreach (int side in new[] { 3, 7, 15, 31 })
            yield return Ratio.Of($"local statistics, mean form {side}x{side}, f32, to a memory copy of the frame", Goal.AtMost(6), MeanForm(input, side), copy);
        yield return Ratio.Of("local statistics, mean form 31x31, f32, to 7x7", Goal.AtMost(1.1), MeanForm(input, 31), MeanForm(input, 7));
        yield return Ratio.Of(
            "local statistics, mean form 7x7, f32, 0.1 % missing, to none missing", Goal.AtMost(1.15), MeanForm(input, 7, Scene.SomeMissing()), MeanForm(input, 7));
    }

    private static Action MeanForm(Plane<float> input, int side, Plane<SampleFlags>? flags = null) =>
        Filtering.Of(new LocalStatisticsFilter(), input, flags, 1, ("window", ParameterValue.Of(side)));

    private static unsafe Action Copy(Plane<float> input)
    {
        float[] target = new float[input.Length];
        return () =>
        {
            fixed (float* from = input.Samples, to = target)
                Buffer.MemoryCopy(from, to, target.Length * sizeof(float), input.Length * sizeof(float));
        };
    }
}
