using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// A frame as the kernels read it: linear values v, and the guide, T times a scale that makes 2^-(difference squared) the
/// weight in range. T counts from its value at the frame's mean, so that a pedestal costs no digits. Rows are padded left and
/// right, planes below, so that sums need no border rule: there, and where a pixel takes no part (missing, saturated), v = 0 and the guide
/// is <see cref="Apart"/>, too far from every other for a weight that counts.
/// </summary>
internal readonly struct GuidedPlanes<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const double Largest = 1e15;
    private readonly int padding;
    private readonly int width;

    /// <summary>Rents planes and leaves the frame's rows unfilled.</summary>
    public GuidedPlanes(SpatialKernel kernel, IScratch scratch)
    {
        padding = kernel.RadiusX;
        width = kernel.Width;
        Values = scratch.Rent<T>(kernel.Stride, kernel.PaddedHeight);
        Guide = scratch.Rent<T>(kernel.Stride, kernel.PaddedHeight);
        for (int y = kernel.Height; y < kernel.PaddedHeight; y++)
        {
            Values.Row(y).Clear();
            Guide.Row(y).Fill(Apart);
        }
    }

    /// <summary>v.</summary>
    public Plane<T> Values { get; }

    /// <summary>T times the scale.</summary>
    public Plane<T> Guide { get; }

    /// <summary>The guide of a pixel that takes no part.</summary>
    private static T Apart => T.CreateTruncating(1e18);

    /// <summary>The mean of the values that take part; 0 when there are none.</summary>
    public static double Mean(Plane<T> input, Plane<SampleFlags> flags, FrameContext context)
    {
        Plane<double> sums = context.Scratch.Rent<double>(2, input.Height);
        context.Bands.ForEach(input.Height, (first, end) =>
        {
            for (int y = first; y < end; y++)
            {
                ReadOnlySpan<T> samples = input.Row(y);
                ReadOnlySpan<SampleFlags> known = flags.Row(y);
                double sum = 0, count = 0;
                for (int x = 0; x < samples.Length; x++)
                {
                    if (GuideLevels.TakesPart(known[x]))
                    {
                        sum += double.CreateTruncating(samples[x]);
                        count++;
                    }
                }

                (sums[0, y], sums[1, y]) = (sum, count);
            }
        });

        double total = 0, samplesTotal = 0;
        for (int y = 0; y < input.Height; y++)
        {
            total += sums[0, y];
            samplesTotal += sums[1, y];
        }

        return samplesTotal == 0 ? 0 : total / samplesTotal;
    }

    /// <summary>Fills row <paramref name="y"/> from a frame.</summary>
    /// <param name="y">Row.</param>
    /// <param name="input">The frame.</param>
    /// <param name="flags">What takes part.</param>
    /// <param name="noise">T.</param>
    /// <param name="origin">T that becomes 0.</param>
    /// <param name="scale">What T is multiplied by.</param>
    /// <param name="rows">Two rows of the frame's width to work in.</param>
    public void FillRow(int y, Plane<T> input, Plane<SampleFlags> flags, NoiseModel noise, double origin, double scale, Plane<double> rows)
    {
        Values.Row(y).Clear();
        Guide.Row(y).Fill(Apart);
        ReadOnlySpan<T> samples = input.Row(y);
        ReadOnlySpan<SampleFlags> known = flags.Row(y);
        Span<double> wide = rows.Row(0), stabilised = rows.Row(1);
        for (int x = 0; x < samples.Length; x++)
            wide[x] = GuideLevels.TakesPart(known[x]) ? double.CreateTruncating(samples[x]) : 0;
        noise.StabiliseByRow(y, wide, stabilised);

        Span<T> values = Inner(Values, y), guide = Inner(Guide, y);
        for (int x = 0; x < samples.Length; x++)
        {
            if (!GuideLevels.TakesPart(known[x]))
                continue;
            values[x] = samples[x];
            guide[x] = T.CreateTruncating(Math.Clamp((stabilised[x] - origin) * scale, -Largest, Largest));
        }
    }

    /// <summary>The pixels of row <paramref name="y"/> of a padded plane, without the padding.</summary>
    public Span<T> Inner(Plane<T> plane, int y) => plane.Row(y).Slice(padding, width);

    /// <summary>The sample of a padded plane's buffer at column 0 of the frame in row <paramref name="y"/>.</summary>
    public ref T StartOfRow(Plane<T> plane, int y) =>
        ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(plane.Buffer), ((nint)y * plane.Width) + padding);
}
