using System.Numerics;
using FsCheck;
using FsCheck.Xunit;
using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.Tests.Means;
using Stacks.TestSupport;

namespace Stacks.Tests.Bilateral;

/// <summary>What holds for the bilateral filter on any plane.</summary>
public class BilateralPropertyTests
{
    private static readonly LinearNoise Camera = new(0.5, 400, 20);

    private static BilateralStep<T> Step<T>(Plane<T> plane, bool conserve, int? vectors = null)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        SpatialKernel kernel = new(1.3, plane.Width, plane.Height);
        return vectors is { } bits
            ? new BilateralStep<T>(kernel, 2.5, conserve, []) { VectorBits = bits }
            : new BilateralStep<T>(kernel, 2.5, conserve, []);
    }

    [Property(MaxTest = 40)]
    public void Constants_stay_constant_to_the_bit(PositiveInt width, PositiveInt height, int seed, bool conserve)
    {
        double level = 1000 * new Random(seed).NextDouble();
        (int columns, int rows) = (1 + (width.Get % 30), 1 + (height.Get % 30));
        Plane<double> wide = FilterRun.PlaneOf(columns, rows, (_, _) => level);
        Xunit.Assert.All(FilterRun.Smooth(Step(wide, conserve), wide, noise: Camera).Samples.ToArray(), v => Xunit.Assert.Equal(level, v));
        Plane<float> narrow = FilterRun.PlaneOf(columns, rows, (_, _) => (float)level);
        Xunit.Assert.All(FilterRun.Smooth(Step(narrow, conserve), narrow, noise: Camera).Samples.ToArray(), v => Xunit.Assert.Equal((float)level, v));
    }

    [Property(MaxTest = 40)]
    public void Conserved_flux_is_conserved_and_plain_results_lie_in_the_range_of_the_plane(PositiveInt width, PositiveInt height, int seed)
    {
        SmoothingScene scene = new(1 + (width.Get % 40), 1 + (height.Get % 40), seed, missing: 0.1, saturated: 0.05);
        double[] before = Sound(scene, scene.Plane);
        if (before.Length == 0)
            return;
        double[] conserved = Sound(scene, FilterRun.Smooth(Step(scene.Plane, conserve: true), scene.Plane, scene.Flags, Camera));
        Xunit.Assert.Equal(1, conserved.Sum() / before.Sum(), 1e-12);

        // No pixel keeps less than nothing of itself: results of a positive self-weight stay within the range too.
        Xunit.Assert.InRange(conserved.Min(), before.Min() - 1e-9, before.Max());
        Xunit.Assert.InRange(conserved.Max(), before.Min(), before.Max() + 1e-9);
        double[] plain = Sound(scene, FilterRun.Smooth(Step(scene.Plane, conserve: false), scene.Plane, scene.Flags, Camera));
        Xunit.Assert.InRange(plain.Min(), before.Min() - 1e-9, before.Max());
        Xunit.Assert.InRange(plain.Max(), before.Min(), before.Max() + 1e-9);
    }

    [Property(MaxTest = 25)]
    public void Bands_and_vector_widths_do_not_change_a_bit(PositiveInt width, PositiveInt height, int seed, bool conserve)
    {
        // Wider than a vector of floats, and than a block of columns in some cases.
        SmoothingScene scene = new(1 + (width.Get * 7 % 170), 1 + (height.Get % 40), seed, missing: 0.1, saturated: 0.05);
        SameBits(scene.Plane, scene.Flags, conserve);
        SameBits(FilterRun.PlaneOf(scene.Plane.Width, scene.Plane.Height, (x, y) => (float)scene.Plane[x, y]), scene.Flags, conserve);
    }

    private static void SameBits<T>(Plane<T> plane, Plane<SampleFlags> flags, bool conserve)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        T[] scalar = FilterRun.Smooth(Step(plane, conserve, vectors: 0), plane, flags, Camera).Samples.ToArray();
        foreach (int bits in new[] { 128, 256, 512 })
            Xunit.Assert.Equal(scalar, FilterRun.Smooth(Step(plane, conserve, bits), plane, flags, Camera).Samples.ToArray());
        foreach (int bands in new[] { 2, 5 })
            Xunit.Assert.Equal(scalar, FilterRun.Smooth(Step(plane, conserve), plane, flags, Camera, bands).Samples.ToArray());
    }

    [Property(MaxTest = 25)]
    public void Scaling_and_shifting_values_and_noise_scales_and_shifts_the_result(int seed, bool conserve)
    {
        SmoothingScene scene = new(25, 19, seed, missing: 0.05);
        Plane<double> changed = FilterRun.PlaneOf(25, 19, (x, y) => (2 * scene.Plane[x, y]) + 100);
        LinearNoise doubled = new(2 * Camera.Slope, 4 * Camera.Floor, (2 * Camera.Pedestal) + 100);
        double[] straight = Sound(scene, FilterRun.Smooth(Step(scene.Plane, conserve), scene.Plane, scene.Flags, Camera));
        double[] result = Sound(scene, FilterRun.Smooth(Step(changed, conserve), changed, scene.Flags, doubled));
        for (int i = 0; i < result.Length; i++)
            Xunit.Assert.Equal((2 * straight[i]) + 100, result[i], 1e-9);
    }

    private static double[] Sound(SmoothingScene scene, Plane<double> plane) =>
        [.. Enumerable.Range(0, plane.Length).Where(i => scene.Flags.Samples[i] == SampleFlags.None).Select(i => plane.Samples[i])];
}
