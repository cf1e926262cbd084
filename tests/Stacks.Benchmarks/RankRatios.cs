using System.Numerics;
using OpenCvSharp;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Benchmarks;

/// <summary>
/// Quartiles of windows, all three together and handed over block by block as filters take them, against others' medians:
/// OpenCV's medianBlur writes a plane of them, scipy's median_filter is timed on a crop and scaled by pixels.
/// </summary>
internal static class RankRatios
{
    private const int ScipyCrop = 256;

    /// <summary>The rows.</summary>
    public static IEnumerable<Ratio> Of(Scene scene)
    {
        Plane<ushort> u16 = scene.Plane<ushort>();
        Plane<float> f32 = scene.Plane<float>();
        if (OpenCv.Missing is { } opencv)
        {
            Console.WriteLine($"# no rows against medianBlur: {opencv}");
        }
        else
        {
            Plane<byte> u8 = new(Array.ConvertAll(u16.Samples.ToArray(), v => (byte)(v / 16)), u16.Width, u16.Height);
            foreach ((int side, double goal16, double goal32) in new[] { (3, 0.9, 0.7), (5, 1.6, 1.0), (7, 6, 3.5) })
            {
                string reference = side == 7 ? "OpenCV medianBlur of 8-bit samples" : "OpenCV medianBlur";
                Action<Mat, Mat> blur = (from, to) => Cv2.MedianBlur(from, to, side);
                yield return Ratio.Of($"quartiles {side}x{side}, u16, 1 thread, to {reference}", goal16, Quartiles(u16, side), side == 7 ? OpenCv.Call(u8, blur) : OpenCv.Call(u16, blur));
                yield return Ratio.Of($"quartiles {side}x{side}, f32, 1 thread, to {reference}", goal32, Quartiles(f32, side), side == 7 ? OpenCv.Call(u8, blur) : OpenCv.Call(f32, blur));
            }
        }

        if (Scipy.Missing is { } scipy)
        {
            Console.WriteLine($"# no rows against scipy: {scipy}");
        }
        else
        {
            foreach ((int side, double goal) in new[] { (9, 200), (15, 130.0) })
                yield return Ratio.Of(Name(side, "u16"), goal, Quartiles(u16, side), Seconds<ushort>(scene, side));
            foreach ((int side, double goal) in new[] { (9, 100), (15, 60), (31, 250.0) })
                yield return Ratio.Of(Name(side, "f32"), goal, Quartiles(f32, side), Seconds<float>(scene, side));
        }

        yield return Ratio.Of("quartiles 31x31, f32, 1 thread: time to that of 15x15", Goal.AtMost(1.3), Quartiles(f32, 31), Quartiles(f32, 15));
        yield return Ratio.Of("quartiles 7x7, f32: 2 threads to 1", 1.9, Quartiles(f32, 7, threads: 2), Quartiles(f32, 7));
        yield return Ratio.Of("quartiles 31x31, f32: 2 threads to 1", 1.9, Quartiles(f32, 31, threads: 2), Quartiles(f32, 31));
        foreach (int side in new[] { 3, 7, 15 })
        {
            yield return Ratio.Of(
                $"quartiles {side}x{side}, u16, 0.1 % missing: time to that with none missing", Goal.AtMost(1.15), Quartiles(u16, side, Scene.SomeMissing()), Quartiles(u16, side));
        }
    }

    private static string Name(int side, string type) =>
        $"quartiles {side}x{side}, {type}, 1 thread, to scipy median_filter (timed on {ScipyCrop} x {ScipyCrop}, scaled by pixels)";

    private static double Seconds<T>(Scene scene, int side)
        where T : unmanaged => Scipy.SecondsPerFrame<T>(scene, ScipyCrop, $"ndimage.median_filter(a, {side}, mode='mirror')");

    private static Action Quartiles<T>(Plane<T> plane, int side, Plane<SampleFlags>? flags = null, int threads = 1)
        where T : unmanaged, INumber<T>
    {
        WindowQuantiles quantiles = new(side, 0.25, 0.5, 0.75);
        Plane<SampleFlags> known = flags ?? new(new SampleFlags[plane.Length], plane.Width, plane.Height);
        Scratch scratch = new();
        IRowBands bands = threads == 1 ? SerialBands.Instance : new ParallelBands(threads);
        return () =>
        {
            scratch.Reset();
            ReflectedRows<T> rows = new(plane, known, SampleFlags.Missing, side / 2, scratch);
            bands.ForEach(plane.Height, (first, end) =>
            {
                QuantileBlocks<T> blocks = quantiles.Over(rows, first, end, scratch);
                while (blocks.Advance())
                {
                }
            });
        };
    }
}
