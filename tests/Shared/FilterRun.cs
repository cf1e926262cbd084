using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.TestSupport;

/// <summary>Runs one filter on one plane, as the pipeline would.</summary>
public static class FilterRun
{
    /// <summary>A plane from samples in rows.</summary>
    public static Plane<T> PlaneOf<T>(int width, int height, Func<int, int, T> sample)
        where T : unmanaged
    {
        Plane<T> plane = new(new T[width * height], width, height);
        for (int y = 0; y < height; y++)
        {
            for (int x = 0; x < width; x++)
                plane[x, y] = sample(x, y);
        }

        return plane;
    }

    /// <summary>Draws shares of missing and saturated samples; missing ones become NaN.</summary>
    public static Plane<SampleFlags> Strike(Plane<double> plane, Random random, double missing, double saturated)
    {
        Plane<SampleFlags> flags = PlaneOf(plane.Width, plane.Height, (_, _) => random.NextDouble() switch
        {
            double r when r < missing => SampleFlags.Missing,
            double r when r < missing + saturated => SampleFlags.Saturated,
            _ => SampleFlags.None,
        });
        for (int i = 0; i < plane.Length; i++)
        {
            if (flags.Samples[i] == SampleFlags.Missing)
                plane.Samples[i] = double.NaN;
        }

        return flags;
    }

    /// <summary>The layout of a plane of <typeparamref name="T"/>.</summary>
    public static FrameLayout LayoutOf<T>(Plane<T> plane)
        where T : unmanaged => new()
        {
            Width = plane.Width,
            Height = plane.Height,
            SampleType = default(T) switch
            {
                ushort => SampleType.UInt16,
                short => SampleType.Int16,
                float => SampleType.Float32,
                _ => SampleType.Float64,
            },
        };

    /// <summary>The filter made ready for a plane, with parameters as a recipe would give them.</summary>
    public static IFilterStep<T> Prepare<T>(IFilterPlugin filter, Plane<T> input, params (string Name, ParameterValue Value)[] given)
        where T : unmanaged
    {
        FrameLayout layout = LayoutOf(input);
        ParameterValues values = new(filter.Parameters, given.ToDictionary(g => g.Name, g => g.Value));
        return (IFilterStep<T>)filter.Prepare(layout, layout.WorkType, values);
    }

    /// <summary>The output of a smoothing step.</summary>
    /// <param name="step">The step.</param>
    /// <param name="input">Values.</param>
    /// <param name="flags">Flags; null for none.</param>
    /// <param name="noise">Noise model; null for none.</param>
    /// <param name="bands">Bands of rows that run side by side.</param>
    /// <param name="report">Receives reported figures.</param>
    public static Plane<T> Smooth<T>(
        IFilterStep<T> step, Plane<T> input, Plane<SampleFlags>? flags = null, NoiseModel? noise = null, int bands = 1, Action<string, double>? report = null)
        where T : unmanaged
    {
        Plane<SampleFlags> known = flags ?? new(new SampleFlags[input.Length], input.Width, input.Height);
        Plane<T> output = new(new T[input.Length], input.Width, input.Height);
        step.Apply(input, known, output, new FrameContext
        {
            FrameIndex = 0,
            Noise = noise,
            HasMissing = Any(known, SampleFlags.Missing),
            HasSaturated = Any(known, SampleFlags.Saturated),
            Bands = bands == 1 ? SerialBands.Instance : new ParallelBands(bands),
            Scratch = new Scratch(),
            Report = report,
        });
        return output;
    }

    private static bool Any(Plane<SampleFlags> flags, SampleFlags wanted)
    {
        foreach (SampleFlags known in flags.Samples)
        {
            if ((known & wanted) != 0)
                return true;
        }

        return false;
    }
}
