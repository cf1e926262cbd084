using System.Numerics;
using Stacks.Abstractions;
using Stacks.Noise;

namespace Stacks.Pipeline;

/// <summary>
/// The values of one frame (or of one sub-lattice of it) in one work type, and the second plane that a step writes to.
/// Buffers are kept from frame to frame.
/// </summary>
internal abstract class WorkPlane
{
    /// <summary>Type of the values.</summary>
    public abstract WorkType Type { get; }

    /// <summary>An empty one for a work type.</summary>
    public static WorkPlane Of(WorkType type) => type switch
    {
        WorkType.UInt16 => new WorkPlane<ushort>(type),
        WorkType.Int16 => new WorkPlane<short>(type),
        WorkType.Float32 => new WorkPlane<float>(type),
        _ => new WorkPlane<double>(type),
    };

    /// <summary>Fits the plane to a shape; the values are then undefined.</summary>
    public abstract void Shape(int width, int height);

    /// <summary>Takes the values of stored samples, the first of them at a place.</summary>
    public abstract void Load(StoredSamples stored, ReadOnlySpan<byte> bytes, ValueTransform transform, int first, int count);

    /// <summary>See <see cref="StoredSamples.Store"/>.</summary>
    public abstract bool Store(StoredSamples stored, ValueTransform transform, Span<byte> bytes);

    /// <summary>See <see cref="StoredSamples.Patch"/>.</summary>
    public abstract bool Patch(StoredSamples stored, ReadOnlySpan<SampleFlags> decisions, ValueTransform transform, Span<byte> bytes);

    /// <summary>Takes its shape and values from a plane of another type.</summary>
    public abstract void Convert(WorkPlane from);

    /// <summary>Runs a step; the values are then its result. Selective: those at pixels it flagged Replaced alone.</summary>
    public abstract void Apply(IFilterStep step, FilterKind kind, Plane<SampleFlags> flags, FrameContext context);

    /// <summary>See <see cref="RankSelection.Median"/>; missing samples do not count.</summary>
    public abstract double Median(ReadOnlySpan<SampleFlags> flags, IScratch scratch);

    /// <summary>Smallest and largest value that is not missing; NaN when there is none.</summary>
    public abstract (double Minimum, double Maximum) Extremes(ReadOnlySpan<SampleFlags> flags);

    /// <summary>See <see cref="DifferenceNoise.Measure"/>.</summary>
    public abstract NoiseMeasurement MeasureNoise(
        Plane<SampleFlags> flags, Lattice lattice, double quantisationStep, NoiseModel? model, IScratch scratch);

    /// <summary>Takes every period-th value of a plane of the same type, from an offset on.</summary>
    public abstract void Split(WorkPlane whole, Lattice lattice, int offsetX, int offsetY);

    /// <summary>Puts its values back at their places in a plane of the same type.</summary>
    public abstract void Join(WorkPlane whole, Lattice lattice, int offsetX, int offsetY);
}

/// <summary>The values in type <typeparamref name="T"/>.</summary>
internal sealed class WorkPlane<T>(WorkType type) : WorkPlane
    where T : unmanaged, INumber<T>
{
    private T[] values = [];
    private T[] other = [];
    private int width;
    private int height;

    public override WorkType Type => type;

    private Plane<T> Values => new(values, width, height);

    public override void Shape(int width, int height)
    {
        (this.width, this.height) = (width, height);
        Fit(ref values);
    }

    public override void Load(StoredSamples stored, ReadOnlySpan<byte> bytes, ValueTransform transform, int first, int count) =>
        stored.Load(bytes, transform, Values.Samples.Slice(first, count));

    public override bool Store(StoredSamples stored, ValueTransform transform, Span<byte> bytes) =>
        stored.Store<T>(Values.Samples, transform, bytes);

    public override bool Patch(StoredSamples stored, ReadOnlySpan<SampleFlags> decisions, ValueTransform transform, Span<byte> bytes) =>
        stored.Patch<T>(Values.Samples, decisions, transform, bytes);

    public override void Convert(WorkPlane from)
    {
        switch (from)
        {
            case WorkPlane<ushort> plane:
                Convert(plane);
                break;
            case WorkPlane<short> plane:
                Convert(plane);
                break;
            case WorkPlane<float> plane:
                Convert(plane);
                break;
            case WorkPlane<double> plane:
                Convert(plane);
                break;
        }
    }

    private void Convert<TFrom>(WorkPlane<TFrom> from)
        where TFrom : unmanaged, INumber<TFrom>
    {
        Shape(from.width, from.height);
        ReadOnlySpan<TFrom> source = from.Values.Samples;
        Span<T> result = Values.Samples;
        for (int i = 0; i < source.Length; i++)
            result[i] = T.CreateTruncating(source[i]);
    }

    public override void Apply(IFilterStep step, FilterKind kind, Plane<SampleFlags> flags, FrameContext context)
    {
        Fit(ref other);
        Plane<T> result = new(other, width, height);
        ((IFilterStep<T>)step).Apply(Values, flags, result, context);
        if (kind == FilterKind.Smoothing)
        {
            (values, other) = (other, values);
            return;
        }

        Span<T> kept = Values.Samples;
        ReadOnlySpan<SampleFlags> decisions = flags.Samples;
        for (int i = FlagScan.NextDecision(decisions, 0); i >= 0; i = FlagScan.NextDecision(decisions, i + 1))
        {
            if ((decisions[i] & SampleFlags.Replaced) != 0)
                kept[i] = other[i];
        }
    }

    public override double Median(ReadOnlySpan<SampleFlags> flags, IScratch scratch) => RankSelection.Median<T>(
        Values.Samples, flags, SampleFlags.Missing, scratch.Rent<int>(RankSelection.Counts, 1).Samples);

    public override (double Minimum, double Maximum) Extremes(ReadOnlySpan<SampleFlags> flags)
    {
        double minimum = double.NaN, maximum = double.NaN;
        ReadOnlySpan<T> samples = Values.Samples;
        for (int i = 0; i < samples.Length; i++)
        {
            if ((flags[i] & SampleFlags.Missing) != 0)
                continue;
            double value = double.CreateTruncating(samples[i]);
            minimum = value >= minimum ? minimum : value;
            maximum = value <= maximum ? maximum : value;
        }

        return (minimum, maximum);
    }

    public override NoiseMeasurement MeasureNoise(
        Plane<SampleFlags> flags, Lattice lattice, double quantisationStep, NoiseModel? model, IScratch scratch) =>
        DifferenceNoise.Measure(Values, flags, lattice, quantisationStep, model, scratch);

    public override void Split(WorkPlane whole, Lattice lattice, int offsetX, int offsetY) =>
        Mosaic.Split(((WorkPlane<T>)whole).Values, lattice, offsetX, offsetY, Values);

    public override void Join(WorkPlane whole, Lattice lattice, int offsetX, int offsetY) =>
        Mosaic.Join(Values, lattice, offsetX, offsetY, ((WorkPlane<T>)whole).Values);

    private void Fit(ref T[] buffer)
    {
        int length = checked(width * height);
        if (buffer.Length < length)
            buffer = GC.AllocateUninitializedArray<T>(length);
    }
}
