using System.Numerics;
using Stacks.Abstractions;
using Stacks.Filters.AdaptiveMedian;
using Stacks.Imaging;

namespace Stacks.Tests.AdaptiveMedian;

/// <summary>Runs adaptive-median on one plane.</summary>
internal static class Cleaning
{
    public static (T[] Output, SampleFlags[] Flags) Run<T>(
        T[] input, SampleFlags[] given, int width, int height, NoiseModel noise, OracleRules rules, int bands = 1, int pitch = 1)
        where T : unmanaged, INumber<T>
    {
        AdaptiveMedianFilter filter = new();
        ParameterValues values = new(filter.Parameters, new Dictionary<string, ParameterValue>
        {
            ["threshold"] = ParameterValue.Of(rules.Threshold),
            ["trust"] = ParameterValue.Of(rules.Trust),
            ["largest_window"] = ParameterValue.Of(rules.LargestWindow),
            ["psf_fwhm"] = ParameterValue.Of(rules.Fwhm),
            ["polarity"] = ParameterValue.Of(rules.Polarity),
        });
        FrameLayout layout = LayoutOf<T>(width, height, rules.QuantisationStep) with { Pitch = pitch };
        IFilterStep<T> step = (IFilterStep<T>)filter.Prepare(layout, layout.WorkType, values);
        Plane<T> output = new((T[])input.Clone(), width, height);
        Plane<SampleFlags> flags = new((SampleFlags[])given.Clone(), width, height);
        step.Apply(new Plane<T>(input, width, height), flags, output, new FrameContext
        {
            FrameIndex = 0,
            Noise = noise,
            HasMissing = given.Any(f => f.HasFlag(SampleFlags.Missing)),
            HasSaturated = given.Any(f => f.HasFlag(SampleFlags.Saturated)),
            Bands = bands == 1 ? SerialBands.Instance : new ParallelBands(bands),
            Scratch = new Scratch(),
        });
        return (output.Buffer, flags.Buffer);
    }

    public static FrameLayout LayoutOf<T>(int width, int height, double quantisationStep) => new()
    {
        Width = width,
        Height = height,
        SampleType = Type.GetTypeCode(typeof(T)) switch
        {
            TypeCode.UInt16 => SampleType.UInt16,
            TypeCode.Int16 => SampleType.Int16,
            TypeCode.Single => SampleType.Float32,
            _ => SampleType.Float64,
        },
        QuantisationStep = quantisationStep,
    };
}

/// <summary>A model whose variance depends on the place too, as a per-pixel map would give.</summary>
internal sealed class UnevenNoise(double slope, double floor, double pedestal) : NoiseModel
{
    public override double LeastVariance => floor;

    public override double Variance(int x, int y, double level) =>
        (slope * Math.Max(level - pedestal, 0)) + (floor * (1 + (((x * 7) + (y * 3)) % 5)));

    public override double Stabilise(int x, int y, double value) => value / Math.Sqrt(Variance(x, y, value));

    public override string Describe() => "uneven";
}
