using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.TestSupport;

namespace Stacks.Benchmarks;

/// <summary>
/// Frames of 2048 x 2048 samples, seeded: a level of 1000 ADU with a gradient, stars, noise of sigma 10 ADU at the level,
/// 0.1 % impulses; as ushort, short and float. And a folder for files.
/// </summary>
internal sealed class Scene : IDisposable
{
    /// <summary>Width and height, pixels.</summary>
    public const int Side = 2048;

    private const double Level = 1000;
    private const int Stars = 3000;
    private const double StarSigma = 1.02;
    private const double Rare = 1e-3;

    private readonly TemporaryFolder folder = new();
    private readonly Dictionary<(Type, int), object> planes = [];

    /// <summary>The noise that is in the frames: 0.1 ADU an electron above 200 ADU, and sigma 10 ADU at 1000 ADU.</summary>
    public static LinearNoise Noise { get; } = new(0.1, 20, 200);

    /// <summary>The layout of every 16-bit frame.</summary>
    public static FrameLayout Layout { get; } = new() { Width = Side, Height = Side, SampleType = SampleType.UInt16, QuantisationStep = 1 };

    /// <summary>A frame; ushort and short are rounded.</summary>
    public Plane<T> Plane<T>(int seed = 0)
        where T : unmanaged
    {
        if (!planes.TryGetValue((typeof(T), seed), out object? known))
        {
            float[] values = typeof(T) == typeof(float) ? Values(seed) : Plane<float>(seed).Buffer;
            Array samples = default(T) switch
            {
                float => values,
                short => Array.ConvertAll(values, v => (short)Math.Clamp(MathF.Round(v), 0, short.MaxValue)),
                ushort => Array.ConvertAll(values, v => (ushort)Math.Clamp(MathF.Round(v), 0, ushort.MaxValue)),
                _ => throw new NotSupportedException(typeof(T).Name),
            };
            planes[(typeof(T), seed)] = known = new Plane<T>((T[])samples, Side, Side);
        }

        return (Plane<T>)known;
    }

    /// <summary>The middle of a frame: for references that would take too long on all of it.</summary>
    public Plane<T> Crop<T>(int side)
        where T : unmanaged
    {
        Plane<T> whole = Plane<T>();
        int corner = (Side - side) / 2;
        return FilterRun.PlaneOf(side, side, (x, y) => whole[corner + x, corner + y]);
    }

    /// <summary>Flags of a frame of which 0.1 % of the samples are missing.</summary>
    public static Plane<SampleFlags> SomeMissing()
    {
        Random random = new(1);
        return FilterRun.PlaneOf(Side, Side, (_, _) => random.NextDouble() < Rare ? SampleFlags.Missing : SampleFlags.None);
    }

    /// <summary>A stack of 16-bit frames in memory; only four differ.</summary>
    public IStackReader Stack(int count) =>
        new ForeignStack([.. Enumerable.Range(0, count).Select(i => (Layout, MemoryMarshal.AsBytes(Plane<ushort>(i % 4).Samples).ToArray()))]);

    /// <summary>Path of a file that is removed at the end.</summary>
    public string File(string name) => folder.File(name);

    /// <inheritdoc/>
    public void Dispose() => folder.Dispose();

    private static float[] Values(int seed)
    {
        Random random = new(seed);
        double[] light = new double[Side * Side];
        for (int i = 0; i < light.Length; i++)
            light[i] = Level + (((i % Side) - (Side / 2)) / 16.0);
        for (int star = 0; star < Stars; star++)
            AddStar(light, random.NextDouble() * Side, random.NextDouble() * Side, 20 * Math.Pow(1 - random.NextDouble(), -0.8));

        float[] samples = new float[light.Length];
        for (int i = 0; i < samples.Length; i++)
        {
            double impulse = random.NextDouble() < Rare ? 100 * Math.Pow(100, random.NextDouble()) : 0;
            samples[i] = (float)Math.Min(short.MaxValue, light[i] + impulse + (Noise.Sigma(0, 0, light[i]) * Normal(random)));
        }

        return samples;
    }

    private static void AddStar(double[] light, double x, double y, double peak)
    {
        const int reach = 7;
        for (int row = Math.Max(0, (int)y - reach); row <= Math.Min(Side - 1, (int)y + reach); row++)
        {
            for (int column = Math.Max(0, (int)x - reach); column <= Math.Min(Side - 1, (int)x + reach); column++)
            {
                double apart = ((column - x) * (column - x)) + ((row - y) * (row - y));
                light[(row * Side) + column] += peak * Math.Exp(-apart / (2 * StarSigma * StarSigma));
            }
        }
    }

    private static double Normal(Random random) => Math.Sqrt(-2 * Math.Log(1 - random.NextDouble())) * Math.Cos(2 * Math.PI * random.NextDouble());
}
