using OpenCvSharp;
using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.TestSupport;

namespace Stacks.Benchmarks;

/// <summary>
/// The fast bilateral filter, at a spatial sigma of 58 px unless a row says otherwise: against OpenCV's, against its plain
/// Gaussian blur, and against itself at other sigmas and on frames of other dynamic range.
/// </summary>
internal static class FastBilateralRatios
{
    private const double Wide = 58;
    private const int CropSide = 128;

    /// <summary>Noise of the same sigma everywhere: the guide is the value itself, a range sigma of 1 is 10 ADU.</summary>
    private static readonly LinearNoise Plain = LinearNoise.Constant(10);

    /// <summary>The rows.</summary>
    public static IEnumerable<Ratio> Of(Scene scene)
    {
        Plane<float> input = scene.Plane<float>();
        Action plain = Fast(input, Wide), conserving = Fast(input, Wide, conserve: true);
        if (OpenCv.Missing is { } reason)
        {
            Ratio.LeftOut("fast bilateral beside OpenCV", reason);
        }
        else
        {
            Plane<float> crop = scene.Crop<float>(CropSide);
            double perPixel = Ratio.TimeOf(OpenCv.Call(crop, (source, result) => Cv2.BilateralFilter(source, result, 0, 25, Wide))) / crop.Length;
            yield return Ratio.Of(
                $"bilateral fast, spatial sigma 58, f32, to OpenCV bilateralFilter of radius 87 on {CropSide} x {CropSide}, scaled by pixels", 300, plain, perPixel * input.Length);
            foreach (int threads in new[] { 1, 2 })
            {
                yield return Ratio.Of(
                    $"bilateral fast, spatial sigma 58, f32, {threads} thread{(threads > 1 ? "s" : "")}, to OpenCV GaussianBlur of the same sigma",
                    Goal.AtMost(0.25),
                    Fast(input, Wide, threads: threads),
                    OpenCv.Call(input, (source, result) => Cv2.GaussianBlur(source, result, new Size(0, 0), Wide), threads));
            }
        }

        yield return Ratio.Of("bilateral fast, f32, spatial sigma 58, to spatial sigma 8", Goal.AtMost(1.3), plain, Fast(input, 8));
        Plane<float> starry = Stars(input);
        Plane<float> narrow = FilterRun.PlaneOf(input.Width, input.Height, (x, y) => Math.Clamp(starry[x, y], 750, 1250));
        yield return Ratio.Of(
            "bilateral fast, f32, spatial sigma 58, a frame of 5000 range sigmas, to the same frame clipped to 50",
            Goal.AtMost(1.5),
            Fast(starry, Wide, rangeSigma: 1, noise: Plain),
            Fast(narrow, Wide, rangeSigma: 1, noise: Plain));
        yield return Ratio.Of("bilateral fast, f32, spatial sigma 58, conserving flux, to not", Goal.AtMost(2.5), conserving, plain);
    }

    private static Action Fast(Plane<float> input, double spatialSigma, int threads = 1, bool conserve = false, double rangeSigma = 2.5, NoiseModel? noise = null) =>
        Filtering.Of(
            new BilateralFilter(),
            input,
            noise ?? Scene.Noise,
            null,
            threads,
            ("spatial_sigma", ParameterValue.Of(spatialSigma)),
            ("range_sigma", ParameterValue.Of(rangeSigma)),
            ("conserve_flux", ParameterValue.Of(conserve)),
            ("method", ParameterValue.Of("fast")));

    /// <summary>The frame with 500 stars more, of peaks to 50,000 ADU.</summary>
    private static Plane<float> Stars(Plane<float> input)
    {
        Random random = new(3);
        Plane<float> result = FilterRun.PlaneOf(input.Width, input.Height, (x, y) => input[x, y]);
        for (int star = 0; star < 500; star++)
        {
            int cx = random.Next(8, input.Width - 8), cy = random.Next(8, input.Height - 8);
            double peak = 50_000 * random.NextDouble();
            for (int y = cy - 7; y <= cy + 7; y++)
            {
                for (int x = cx - 7; x <= cx + 7; x++)
                    result[x, y] += (float)(peak * Math.Exp(-(((x - cx) * (x - cx)) + ((y - cy) * (y - cy))) / 2.1));
            }
        }

        return result;
    }
}
