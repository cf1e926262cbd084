using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// A frame's guide T on the axis of range levels: every sample's place on it, and for every level how many samples have
/// it as their first, with the value of one of them.
/// </summary>
internal sealed class GuideLevels
{
    /// <summary>Levels of the axis; the frame's first sample that takes part lies in the middle.</summary>
    public const int Axis = 1 << (31 - LevelWeights.FractionBits);

    /// <summary>A guide sample that takes no part.</summary>
    public const int Absent = -1;

    private const int Margin = 2 * LevelWeights.Lanes;

    private readonly Lock gate = new();
    private readonly Plane<int> bandOfValue;
    private bool fits = true;

    /// <summary>Rents planes for a frame.</summary>
    public GuideLevels(int width, int height, IScratch scratch)
    {
        Samples = scratch.Rent<int>(width, height);
        Counts = scratch.Rent<int>(Axis, 1);
        Values = scratch.Rent<double>(Axis, 1);
        bandOfValue = scratch.Rent<int>(Axis, 1);
        Counts.Samples.Clear();
    }

    /// <summary>T as whole numbers, level times 2^15 and the place between levels; or <see cref="Absent"/>.</summary>
    public Plane<int> Samples { get; }

    /// <summary>Samples whose first level this is.</summary>
    public Plane<int> Counts { get; }

    /// <summary>The value of the first of them in the frame; undefined where there is none.</summary>
    public Plane<double> Values { get; }

    /// <summary>Bytes of all this on one band.</summary>
    public static long Bytes(int width, int height) => ((long)width * height * sizeof(int)) + (Axis * 32L);

    /// <summary>Fills the planes; false when T spans more than the axis.</summary>
    /// <param name="input">Values.</param>
    /// <param name="flags">Missing and saturated samples take no part.</param>
    /// <param name="perSigma">Levels in a noise sigma.</param>
    /// <param name="context">Noise model, bands and scratch.</param>
    public bool Fill<T>(Plane<T> input, Plane<SampleFlags> flags, double perSigma, FrameContext context)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        NoiseModel noise = context.Noise!;
        double origin = 0;
        for (int i = 0; i < input.Length; i++)
        {
            if (TakesPart(flags.Samples[i]))
            {
                origin = noise.Stabilise(i % input.Width, i / input.Width, double.CreateTruncating(input.Samples[i]));
                break;
            }
        }

        context.Bands.ForEach(input.Height, (first, end) =>
        {
            Plane<double> rows = context.Scratch.Rent<double>(input.Width, 2);
            Plane<int> counts = context.Scratch.Rent<int>(Axis, 1);
            Plane<double> values = context.Scratch.Rent<double>(Axis, 1);
            counts.Samples.Clear();
            bool good = true;
            for (int y = first; y < end; y++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                ReadOnlySpan<T> samples = input.Row(y);
                Span<double> v = rows.Row(0);
                for (int x = 0; x < v.Length; x++)
                    v[x] = double.CreateTruncating(samples[x]);
                noise.StabiliseByRow(y, rows.Row(0), rows.Row(1));
                good &= FillRow(rows, flags.Row(y), Samples.Row(y), counts.Samples, values.Samples, origin, perSigma);
            }

            Merge(first, good, counts.Samples, values.Samples);
        });
        return fits;
    }

    /// <summary>True for samples that are neither missing nor saturated.</summary>
    public static bool TakesPart(SampleFlags flags) => (flags & (SampleFlags.Missing | SampleFlags.Saturated)) == 0;

    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static bool FillRow(
        Plane<double> rows, ReadOnlySpan<SampleFlags> flags, Span<int> samples, Span<int> counts, Span<double> values, double origin, double perSigma)
    {
        const double one = 1 << LevelWeights.FractionBits;
        const double least = Margin * one, most = (Axis - Margin) * one;
        ReadOnlySpan<double> v = rows.Row(0)[..samples.Length], t = rows.Row(1)[..samples.Length];
        flags = flags[..samples.Length];
        double scale = perSigma * one;
        bool fits = true;
        for (int x = 0; x < samples.Length; x++)
        {
            if (!TakesPart(flags[x]))
            {
                samples[x] = Absent;
                continue;
            }

            double place = ((t[x] - origin) * scale) + (Axis / 2 * one) + 0.5;
            if (!(place > least && place < most))
            {
                fits = false;
                samples[x] = Absent;
                continue;
            }

            int sample = (int)place;
            samples[x] = sample;
            int level = sample >> LevelWeights.FractionBits;
            if (counts[level]++ == 0)
                values[level] = v[x];
        }

        return fits;
    }

    private void Merge(int band, bool good, ReadOnlySpan<int> counts, ReadOnlySpan<double> values)
    {
        lock (gate)
        {
            fits &= good;
            for (int level = 0; level < Axis; level++)
            {
                if (counts[level] == 0)
                    continue;
                if (Counts.Samples[level] == 0 || band < bandOfValue.Samples[level])
                {
                    Values.Samples[level] = values[level];
                    bandOfValue.Samples[level] = band;
                }

                Counts.Samples[level] += counts[level];
            }
        }
    }
}
