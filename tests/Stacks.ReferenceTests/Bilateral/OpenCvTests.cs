using OpenCvSharp;
using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.TestSupport;
using Xunit;
using Xunit.Abstractions;

namespace Stacks.ReferenceTests.Bilateral;

/// <summary>
/// The plain form against OpenCV's bilateralFilter on 32-bit samples, through one sum in double that takes the support as
/// a parameter: OpenCV's is a disc of radius d / 2, ours one of radius 4.5 ss. OpenCV's weights come from a table of
/// 4096 steps and its sums are in float, which errs by some 1e-5 of the level.
/// </summary>
public class OpenCvTests(ITestOutputHelper log)
{
    private const int Radius = 6;
    private const int Far = 9;
    private const double SpatialSigma = 1.5;
    private const double Noise = 5;

    [OpenCvTheory]
    [InlineData(1.0)]
    [InlineData(2.5)]
    [InlineData(20.0)]
    public void Agrees_with_its_32_bit_filter_within_the_accuracy_of_its_table(double range)
    {
        const int side = 80;
        Random random = new(11);
        Plane<float> input = FilterRun.PlaneOf(side, side, (x, y) => (float)(
            100 + (x > 50 ? 80 : 0) + (y * 0.5) + (400 * Math.Exp(-(Math.Pow(x - 30, 2) + Math.Pow(y - 40, 2)) / 4)) + (Noise * Normal(random))));
        Plane<float> ours = FilterRun.Smooth(
            FilterRun.Prepare(
                new BilateralFilter(), input, ("spatial_sigma", ParameterValue.Of(SpatialSigma)), ("range_sigma", ParameterValue.Of(range)), ("conserve_flux", ParameterValue.Of(false))),
            input,
            noise: LinearNoise.Constant(Noise));

        using Mat source = new(side, side, MatType.CV_32FC1), result = new();
        source.SetArray(input.Samples.ToArray());
        Cv2.BilateralFilter(source, result, (2 * Radius) + 1, range * Noise, SpatialSigma);
        Assert.True(result.GetArray(out float[] theirs));

        double table = 0, kernel = 0, whole = 0, change = 0;
        for (int y = Far; y < side - Far; y++)
        {
            for (int x = Far; x < side - Far; x++)
            {
                double onDisc = Sum(input, x, y, range, (dx, dy) => (dx * dx) + (dy * dy) <= Radius * Radius);
                double onOurs = Sum(input, x, y, range, (dx, dy) => (dx * dx) + (dy * dy) <= 4.5 * 4.5 * SpatialSigma * SpatialSigma);
                double onAll = Sum(input, x, y, range, (_, _) => true);
                table = Math.Max(table, Math.Abs(theirs[(y * side) + x] - onDisc));
                kernel = Math.Max(kernel, Math.Abs(ours[x, y] - onOurs));
                whole = Math.Max(whole, Math.Abs(ours[x, y] - onAll) / (range * Noise));
                change = Math.Max(change, Math.Abs(ours[x, y] - input[x, y]));
            }
        }

        log.WriteLine($"range {range} sigmas: OpenCV to the sum on its disc {table:E2} ADU; ours to the sum on its own {kernel:E2} ADU, to the sum over 6 ss {whole:E2} range sigmas; largest change {change:F1} ADU");
        Assert.True(change > Noise, "the filter does something");
        Assert.True(table < 6e-3, $"OpenCV and the sum differ by {table:E2} ADU at levels to 600 ADU");
        Assert.True(kernel < 6e-5, $"the kernel and the sum differ by {kernel:E2} ADU, more than a float's rounding at 600 ADU");
        Assert.True(whole < 1e-4, $"the cut at 4.5 ss costs {whole:E2} range sigmas");
    }

    /// <summary>sum w v / sum w over the pixels of a support, w by Math.Exp, cut at 6 ss.</summary>
    private static double Sum(Plane<float> v, int x, int y, double range, Func<int, int, bool> inside)
    {
        double sum = 0, weights = 0;
        for (int dy = -Far; dy <= Far; dy++)
        {
            for (int dx = -Far; dx <= Far; dx++)
            {
                if (!inside(dx, dy))
                    continue;
                double apart = ((double)v[x + dx, y + dy] - v[x, y]) / (range * Noise);
                double w = Math.Exp((-((dx * dx) + (dy * dy)) / (2 * SpatialSigma * SpatialSigma)) - (apart * apart / 2));
                sum += w * v[x + dx, y + dy];
                weights += w;
            }
        }

        return sum / weights;
    }

    private static double Normal(Random random) =>
        Math.Sqrt(-2 * Math.Log(1 - random.NextDouble())) * Math.Cos(2 * Math.PI * random.NextDouble());
}

/// <summary>A theory that is skipped where OpenCV's native library does not load (Debian: libgtk-3-0).</summary>
[AttributeUsage(AttributeTargets.Method)]
public sealed class OpenCvTheoryAttribute : TheoryAttribute
{
    private static readonly Lazy<string?> Reason = new(() =>
    {
        try
        {
            Cv2.GetVersionString();
            return null;
        }
        catch (Exception error) when (error is TypeInitializationException or DllNotFoundException or OpenCvSharpException)
        {
            return "OpenCV's native library is not here";
        }
    });

    public OpenCvTheoryAttribute() => Skip = Reason.Value;
}
