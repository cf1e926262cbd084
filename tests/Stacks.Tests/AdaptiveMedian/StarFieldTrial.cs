using Stacks.Abstractions;

namespace Stacks.Tests.AdaptiveMedian;

/// <summary>What was planted into a pixel.</summary>
internal enum Planted
{
    Nothing,
    Isolated,
    Track,
    PathTrack,
    Block,
    OnStar,
}

/// <summary>
/// A seeded star field with impulses, and what is true of every pixel. Gaussian stars integrated over pixels by their
/// expected light, Poisson noise of the light, Gaussian read noise, integer samples. Impulses are drawn as those of the
/// sample stack: heights in sigmas of the empty background, events at least 5 px apart.
/// </summary>
internal sealed class StarFieldTrial
{
    public const double Gain = 1.46, ReadNoise = 3.2, Pedestal = 200;
    private const ushort Full = 12_000;

    private readonly Random random;
    private readonly bool[] taken;
    private int events;

    public StarFieldTrial(int side, int seed, double fwhm = 2.4, double sky = 120, int stars = 150, int eventsOfAKind = 40)
    {
        Side = side;
        random = new Random(seed);
        taken = new bool[side * side];
        Light = new double[side * side];
        Stars = new double[side * side];
        Peak = new double[side * side];
        Height = new double[side * side];
        Kind = new Planted[side * side];
        Event = new int[side * side];
        Core = new bool[side * side];
        Samples = new ushort[side * side];
        Flags = new SampleFlags[side * side];
        for (int star = 0; star < stars; star++)
            Plant(fwhm, Math.Pow(10, 2.7 + (2.6 * random.NextDouble())), random.NextDouble() * side, random.NextDouble() * side);
        for (int i = 0; i < Light.Length; i++)
            Light[i] = Stars[i] + sky;
        BackgroundSigma = Noise.Sigma(0, 0, Pedestal + (sky / Gain));
        for (int i = 0; i < eventsOfAKind; i++)
        {
            PlantIsolated();
            PlantTrack();
            PlantPathTrack();
            PlantBlock();
            PlantOnStar();
        }

        for (int i = 0; i < Samples.Length; i++)
        {
            double electrons = Poisson(Light[i]) + (ReadNoise * Normal());
            double v = Math.Round(Pedestal + (electrons / Gain) + Height[i]);
            Samples[i] = (ushort)Math.Clamp(v, 0, Full);
            if (v >= Full)
                Flags[i] |= SampleFlags.Saturated;
        }
    }

    public int Side { get; }

    /// <summary>Expected electrons.</summary>
    public double[] Light { get; }

    /// <summary>Expected electrons of stars alone.</summary>
    public double[] Stars { get; }

    /// <summary>ADU of the brightest expected star pixel within 4 px.</summary>
    public double[] Peak { get; }

    /// <summary>ADU added by impulses.</summary>
    public double[] Height { get; }

    public Planted[] Kind { get; }

    /// <summary>Number of the event that struck the pixel, from 1; 0 for none.</summary>
    public int[] Event { get; }

    /// <summary>Within half the FWHM of a star's centre, or its brightest pixel.</summary>
    public bool[] Core { get; }

    public ushort[] Samples { get; }

    public SampleFlags[] Flags { get; }

    public double BackgroundSigma { get; }

    public static LinearNoise Noise { get; } = LinearNoise.FromCamera(Gain, ReadNoise, Pedestal, 1);

    /// <summary>Centres of all stars, and their flux in electrons.</summary>
    public List<(double X, double Y, double Flux)> Centres { get; } = [];

    /// <summary>Noise at the expected level without impulses, ADU.</summary>
    public double LocalSigma(int i) => Noise.Sigma(0, 0, Pedestal + (Light[i] / Gain));

    private void Plant(double fwhm, double flux, double x, double y)
    {
        Centres.Add((x, y, flux));
        double sigma = fwhm / (2 * Math.Sqrt(2 * Math.Log(2)));
        int reach = (int)Math.Ceiling(6 * sigma);
        double peak = 0;
        for (int j = (int)y - reach; j <= (int)y + reach; j++)
        {
            for (int i = (int)x - reach; i <= (int)x + reach; i++)
            {
                if (i < 0 || j < 0 || i >= Side || j >= Side)
                    continue;
                double light = flux * Share(i - x, sigma) * Share(j - y, sigma);
                Stars[(j * Side) + i] += light;
                peak = Math.Max(peak, light);
                double distance = Math.Sqrt(((i - x) * (i - x)) + ((j - y) * (j - y)));
                Core[(j * Side) + i] |= distance <= Math.Max(fwhm / 2, 0.75);
            }
        }

        for (int j = (int)y - 4; j <= (int)y + 4; j++)
            for (int i = (int)x - 4; i <= (int)x + 4; i++)
                if (i >= 0 && j >= 0 && i < Side && j < Side)
                    Peak[(j * Side) + i] = Math.Max(Peak[(j * Side) + i], peak / Gain);
    }

    /// <summary>Share of a unit normal of a sigma that falls on the pixel whose centre is an offset away.</summary>
    private static double Share(double offset, double sigma) =>
        MathNet.Numerics.Distributions.Normal.CDF(0, sigma, offset + 0.5) - MathNet.Numerics.Distributions.Normal.CDF(0, sigma, offset - 0.5);

    private double DrawHeight()
    {
        double lot = random.NextDouble();
        return BackgroundSigma * (lot < 0.8 ? 10 + (50 * random.NextDouble())
            : lot < 0.92 ? 60 * Math.Pow(50, random.NextDouble())
            : 4 + (6 * random.NextDouble()));
    }

    private void PlantIsolated()
    {
        double height = DrawHeight();
        Try(Planted.Isolated, (x, y) => [(x, y, height)]);
    }

    private void PlantOnStar()
    {
        (double x, double y, _) = Centres[random.Next(Centres.Count)];
        double height = DrawHeight(), angle = 2 * Math.PI * random.NextDouble(), distance = 3 * random.NextDouble();
        int column = (int)Math.Round(x + (distance * Math.Cos(angle))), row = (int)Math.Round(y + (distance * Math.Sin(angle)));
        Try(Planted.OnStar, (_, _) => [(column, row, height)]);
    }

    private void PlantBlock()
    {
        double height = DrawHeight();
        Try(Planted.Block, (x, y) => [(x, y, height), (x + 1, y, height), (x, y + 1, height), (x + 1, y + 1, height)]);
    }

    private void PlantTrack()
    {
        double height = DrawHeight(), angle = random.NextDouble() * Math.PI;
        int length = 4 + random.Next(12);
        Try(Planted.Track, (x, y) =>
        {
            // One pixel a step along the longer axis: an 8-connected line.
            double dx = Math.Cos(angle), dy = Math.Sin(angle), longer = Math.Max(Math.Abs(dx), Math.Abs(dy));
            return [.. Enumerable.Range(0, length).Select(s => (x + (int)Math.Round(s * dx / longer), y + (int)Math.Round(s * dy / longer), height))];
        });
    }

    private void PlantPathTrack()
    {
        double height = DrawHeight(), angle = random.NextDouble() * Math.PI, length = 4 + (12 * random.NextDouble());
        double offsetX = random.NextDouble(), offsetY = random.NextDouble();
        Try(Planted.PathTrack, (x, y) =>
        {
            const double Step = 0.002;
            Dictionary<(int, int), double> path = [];
            for (double s = 0; s < length; s += Step)
            {
                (int, int) pixel = ((int)Math.Floor(x + offsetX + (s * Math.Cos(angle))), (int)Math.Floor(y + offsetY + (s * Math.Sin(angle))));
                path[pixel] = path.GetValueOrDefault(pixel) + Step;
            }

            return [.. path.Select(p => (p.Key.Item1, p.Key.Item2, height * p.Value))];
        });
    }

    private void Try(Planted kind, Func<int, int, List<(int X, int Y, double Height)>> shape)
    {
        for (int attempt = 0; attempt < 200; attempt++)
        {
            List<(int X, int Y, double Height)> pixels = shape(random.Next(Side), random.Next(Side));
            if (!pixels.TrueForAll(p => p.X >= 0 && p.Y >= 0 && p.X < Side && p.Y < Side && !taken[(p.Y * Side) + p.X]))
                continue;
            events++;
            foreach ((int x, int y, double height) in pixels)
            {
                Event[(y * Side) + x] = events;
                Height[(y * Side) + x] = height;
                Kind[(y * Side) + x] = kind;
                for (int j = Math.Max(0, y - 4); j <= Math.Min(Side - 1, y + 4); j++)
                    for (int i = Math.Max(0, x - 4); i <= Math.Min(Side - 1, x + 4); i++)
                        taken[(j * Side) + i] = true;
            }

            return;
        }
    }

    private double Normal() =>
        Math.Sqrt(-2 * Math.Log(1 - random.NextDouble())) * Math.Cos(2 * Math.PI * random.NextDouble());

    private double Poisson(double mean)
    {
        if (mean > 500)
            return Math.Round(mean + (Math.Sqrt(mean) * Normal()));
        double limit = Math.Exp(-mean), product = 1;
        int count = -1;
        do
        {
            count++;
            product *= random.NextDouble();
        }
        while (product > limit);
        return count;
    }
}
