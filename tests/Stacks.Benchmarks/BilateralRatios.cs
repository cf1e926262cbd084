using System.Diagnostics;
using OpenCvSharp;
using Stacks.Abstractions;
using Stacks.Filters.Bilateral;

namespace Stacks.Benchmarks;

/// <summary>The bilateral filter in its exact form against OpenCV's bilateralFilter, and its own forms beside each other.</summary>
internal static class BilateralRatios
{
    private const double RangeSigma = 2.5;
    private const double RangeAdu = 25;

    /// <summary>The rows.</summary>
    public static IEnumerable<Ratio> Of(Scene scene)
    {
        Plane<float> whole = scene.Plane<float>();
        if (OpenCv.Missing is { } reason)
        {
            Ratio.LeftOut("bilateral, exact, to OpenCV", reason);
        }
        else
        {
            foreach ((double sigma, int side) in new[] { (2.0, Scene.Side), (3, 1024), (4, 1024), (5, 1024) })
            {
                Plane<float> input = side == Scene.Side ? whole : scene.Crop<float>(side);
                yield return Ratio.Of(
                    $"bilateral, exact, spatial sigma {sigma}, f32, {side} x {side}, to OpenCV bilateralFilter of radius {Radius(sigma)}", 3, Exact(input, sigma), Reference(input, sigma));
            }

            const double wide = 19.4;
            Plane<float> small = scene.Crop<float>(512);
            Action reference = Reference(small, wide);
            long start = Stopwatch.GetTimestamp();
            reference();
            double once = Stopwatch.GetElapsedTime(start).TotalSeconds;
            yield return Ratio.Of($"bilateral, exact, f32, 512 x 512, to OpenCV bilateralFilter, both of radius {Radius(wide)}", 3, Exact(small, wide), once);
        }

        yield return Ratio.Of("bilateral, exact, spatial sigma 3, f32, two threads to one", 1.9, Exact(whole, 3, threads: 2), Exact(whole, 3));
        foreach (double sigma in new[] { 1.5, 2, 3 })
            yield return Ratio.Of($"bilateral, exact, spatial sigma {sigma}, f32, flux conserved, to plain", Goal.AtMost(2.5), Exact(whole, sigma, conserve: true), Exact(whole, sigma));
    }

    private static int Radius(double sigma) => (int)(4.5 * sigma);

    private static Action Exact(Plane<float> input, double sigma, bool conserve = false, int threads = 1) => Filtering.Of(
        new BilateralFilter(),
        input,
        null,
        threads,
        ("spatial_sigma", ParameterValue.Of(sigma)),
        ("range_sigma", ParameterValue.Of(RangeSigma)),
        ("conserve_flux", ParameterValue.Of(conserve)),
        ("method", ParameterValue.Of("exact")));

    /// <summary>On one thread; its range sigma is in ADU, the same at every level.</summary>
    private static Action Reference(Plane<float> input, double sigma) =>
        OpenCv.Call(input, (source, result) => Cv2.BilateralFilter(source, result, (2 * Radius(sigma)) + 1, RangeAdu, sigma));
}
