using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// A frame as the kernel reads it, in double: linear values v, the guide T, and a factor c of every pixel in its
/// neighbours' sums. Rows are padded left and right by the kernel's reach with pixels of factor 0, so that sums need no
/// border rule; pixels that take no part (missing, saturated) have v = T = c = 0 as well.
/// </summary>
internal readonly struct GuidedPlanes
{
    private readonly int padding;

    /// <summary>Rents planes and leaves them unfilled.</summary>
    public GuidedPlanes(SpatialKernel kernel, IScratch scratch)
    {
        padding = kernel.RadiusX;
        Values = scratch.Rent<double>(kernel.Stride, kernel.Height);
        Guide = scratch.Rent<double>(kernel.Stride, kernel.Height);
        Factors = scratch.Rent<double>(kernel.Stride, kernel.Height);
    }

    private GuidedPlanes(GuidedPlanes other, Plane<double> factors)
    {
        this = other;
        Factors = factors;
    }

    /// <summary>v.</summary>
    public Plane<double> Values { get; }

    /// <summary>T.</summary>
    public Plane<double> Guide { get; }

    /// <summary>c.</summary>
    public Plane<double> Factors { get; }

    /// <summary>The same frame with other factors.</summary>
    public GuidedPlanes With(Plane<double> factors) => new(this, factors);

    /// <summary>The pixels of row <paramref name="y"/> of a padded plane, without the padding.</summary>
    public Span<double> Inner(Plane<double> plane, int y) => plane.Row(y)[padding..^padding];

    /// <summary>Fills row <paramref name="y"/> from a frame; c becomes 1, or 0 where a pixel takes no part.</summary>
    public void FillRow<T>(int y, Plane<T> input, Plane<SampleFlags> flags, NoiseModel noise)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        Values.Row(y).Clear();
        Guide.Row(y).Clear();
        Factors.Row(y).Clear();
        Span<double> values = Inner(Values, y), guide = Inner(Guide, y), factors = Inner(Factors, y);
        ReadOnlySpan<T> samples = input.Row(y);
        ReadOnlySpan<SampleFlags> known = flags.Row(y);
        for (int x = 0; x < samples.Length; x++)
        {
            if ((known[x] & (SampleFlags.Missing | SampleFlags.Saturated)) == 0)
            {
                values[x] = double.CreateTruncating(samples[x]);
                factors[x] = 1;
            }
        }

        noise.StabiliseByRow(y, values, guide);
        for (int x = 0; x < samples.Length; x++)
        {
            if (factors[x] == 0)
                guide[x] = 0;
        }
    }

    /// <summary>The sample of a padded plane's buffer at column 0 of the frame in row <paramref name="y"/>.</summary>
    public ref double StartOfRow(Plane<double> plane, int y) =>
        ref Unsafe.Add(
            ref MemoryMarshal.GetArrayDataReference(plane.Buffer), ((nint)y * plane.Width) + padding);
}
