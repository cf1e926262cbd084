using Stacks.Abstractions;
using Stacks.TestSupport;

namespace Stacks.Tests.Bilateral;

/// <summary>
/// A seeded frame with noise, a gradient, edges and stars, and the bilateral filter's value at one of its pixels from the
/// formula: the sum over all q in double with Math.Exp, without any cut (Tomasi and Manduchi, ICCV 1998).
/// </summary>
internal sealed class FastScene
{
    public const double Noise = 10;

    public FastScene(int width, int height, int seed, double peak, double missing = 0, double saturated = 0, double pedestal = 1000)
    {
        Random random = new(seed);
        Plane = FilterRun.PlaneOf(width, height, (x, y) =>
            pedestal + (x / 8.0) + (x > 0.6 * width ? 60 : 0) + (y > 0.7 * height ? -500 : 0) + (Noise * Normal(random)));
        for (int star = 0; star < width * height / 2500; star++)
        {
            int cx = random.Next(width), cy = random.Next(height);
            double flux = peak * Math.Pow(random.NextDouble(), 2);
            Stars.Add((cx, cy));
            for (int y = Math.Max(0, cy - 6); y <= Math.Min(height - 1, cy + 6); y++)
            {
                for (int x = Math.Max(0, cx - 6); x <= Math.Min(width - 1, cx + 6); x++)
                    Plane[x, y] += flux * Math.Exp(-(((x - cx) * (x - cx)) + ((y - cy) * (y - cy))) / 2.1);
            }
        }

        Flags = FilterRun.Strike(Plane, random, missing, saturated);
    }

    public Plane<double> Plane { get; }

    public Plane<SampleFlags> Flags { get; }

    public List<(int X, int Y)> Stars { get; } = [];

    /// <summary>Star cores and their wings, pixels at edges and borders, and others anywhere.</summary>
    public List<(int X, int Y)> Places(int count, int seed)
    {
        Random random = new(seed);
        List<(int X, int Y)> places = [];
        for (int i = 0; i < count; i++)
        {
            places.Add((random.Next(Plane.Width), random.Next(Plane.Height)));
            places.Add(((int)(0.6 * Plane.Width) + random.Next(-2, 3), random.Next(Plane.Height)));
            places.Add((random.Next(Plane.Width), (int)(0.7 * Plane.Height) + random.Next(-2, 3)));
            places.Add((0, random.Next(Plane.Height)));
            if (Stars.Count > 0)
            {
                (int x, int y) = Stars[random.Next(Stars.Count)];
                places.Add((x, y));
                places.Add((x + random.Next(-3, 4), y + random.Next(-3, 4)));
            }
        }

        return [.. places.Where(p => p.X >= 0 && p.Y >= 0 && p.X < Plane.Width && p.Y < Plane.Height && Flags[p.X, p.Y] == SampleFlags.None)];
    }

    /// <summary>The bilateral filter's value at a pixel.</summary>
    public double Sum(int px, int py, double spatial, double range, NoiseModel noise)
    {
        double own = noise.Stabilise(px, py, Plane[px, py]), weights = 0, exchange = 0;
        for (int y = 0; y < Plane.Height; y++)
        {
            for (int x = 0; x < Plane.Width; x++)
            {
                if (Flags[x, y] != SampleFlags.None)
                    continue;
                double apart = noise.Stabilise(x, y, Plane[x, y]) - own, dx = x - px, dy = y - py;
                double w = Math.Exp((-((dx * dx) + (dy * dy)) / (2 * spatial * spatial)) - (apart * apart / (2 * range * range)));
                weights += w;
                exchange += w * (Plane[x, y] - Plane[px, py]);
            }
        }

        return Plane[px, py] + (exchange / weights);
    }

    /// <summary>The worst difference of a result at places, in range sigmas.</summary>
    public double Worst(Plane<double> result, IEnumerable<(int X, int Y)> places, double spatial, double range, NoiseModel noise) => places.AsParallel()
        .Max(p => Math.Abs(result[p.X, p.Y] - Sum(p.X, p.Y, spatial, range, noise)) / (range * noise.Sigma(p.X, p.Y, Plane[p.X, p.Y])));

    private static double Normal(Random random) =>
        Math.Sqrt(-2 * Math.Log(1 - random.NextDouble())) * Math.Cos(2 * Math.PI * random.NextDouble());
}
