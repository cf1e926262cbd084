namespace Stacks.SampleStacks;

/// <summary>A pixel of an impulse, relative to the impulse's place, and its share of the height.</summary>
internal readonly record struct ImpulsePixel(int X, int Y, double Share);

/// <summary>The shapes of impulses.</summary>
internal static class ImpulseShapes
{
    /// <summary>One pixel.</summary>
    public static List<ImpulsePixel> Single() => [new(0, 0, 1)];

    /// <summary>2 x 2 pixels of equal charge.</summary>
    public static List<ImpulsePixel> Block() => [new(0, 0, 1), new(1, 0, 1), new(0, 1, 1), new(1, 1, 1)];

    /// <summary>A straight 8-connected track, one pixel for each step along its longer axis, all of equal charge.</summary>
    public static List<ImpulsePixel> Track(RandomSource random)
    {
        (double x, double y) = random.Direction();
        double longer = Math.Max(Math.Abs(x), Math.Abs(y));
        int pixels = 4 + random.Index(13);
        return [.. Enumerable.Range(0, pixels).Select(i =>
            new ImpulsePixel((int)Math.Round(i * x / longer), (int)Math.Round(i * y / longer), 1))];
    }

    /// <summary>A straight line 5 to 20 px long from a point inside pixel (0, 0): each pixel's share is the line's length inside it.</summary>
    public static List<ImpulsePixel> PathTrack(RandomSource random)
    {
        (double x, double y) = random.Direction();
        double startX = random.Between(-0.5, 0.5), startY = random.Between(-0.5, 0.5), length = random.Between(5, 20);
        List<double> cuts = [0, length];
        AddCrossings(cuts, startX, x, length);
        AddCrossings(cuts, startY, y, length);
        cuts.Sort();

        List<ImpulsePixel> pixels = [];
        for (int i = 1; i < cuts.Count; i++)
        {
            double middle = (cuts[i - 1] + cuts[i]) / 2;
            pixels.Add(new ImpulsePixel(
                (int)Math.Round(startX + (middle * x)), (int)Math.Round(startY + (middle * y)), cuts[i] - cuts[i - 1]));
        }

        return pixels;
    }

    // Where along the line it crosses from one pixel to the next on one axis.
    private static void AddCrossings(List<double> cuts, double start, double slope, double length)
    {
        int steps = (int)(Math.Abs(slope) * length) + 1;
        for (int i = 0; i <= steps; i++)
        {
            double at = ((slope > 0 ? i + 0.5 : -i - 0.5) - start) / slope;
            if (at > 0 && at < length)
                cuts.Add(at);
        }
    }
}

/// <summary>The impulses of one frame: their charge, and the places that are taken.</summary>
/// <param name="light">The frame's light, without impulses.</param>
/// <param name="sky">Electrons in every pixel that are not star light.</param>
/// <param name="detector">The detector.</param>
internal sealed class ImpulseField(Light light, double sky, Detector detector)
{
    /// <summary>Impulses of different events keep this far apart (larger of the distances in x and y), so that each is judged alone.</summary>
    public const int Clearance = 4;

    private readonly bool[] taken = new bool[light.Electrons.Length];
    private int events;

    /// <summary>Charge in electrons, row after row.</summary>
    public double[] Charge { get; } = new double[light.Electrons.Length];

    /// <summary>Noise sigma of the empty background, ADU.</summary>
    public double BackgroundSigma => detector.Sigma(sky);

    /// <summary>
    /// A height in sigmas: 80 % uniform from 10 to 60, a tail of 12 % uniform in logarithm from 60 to 3000, and 8 %
    /// uniform from 4 to 10, below what the truth figures are stated for.
    /// </summary>
    public static double DrawHeight(RandomSource random) => random.Uniform() switch
    {
        < 0.08 => random.Between(4, 10),
        < 0.88 => random.Between(10, 60),
        _ => random.LogBetween(60, 3000),
    };

    /// <summary>True when all of the shape is inside the frame and clear of other events.</summary>
    public bool Fits(IReadOnlyList<ImpulsePixel> shape, int x, int y) => shape.All(pixel =>
        x + pixel.X >= 0 && x + pixel.X < light.Width && y + pixel.Y >= 0 && y + pixel.Y < light.Height
        && !taken[((y + pixel.Y) * light.Width) + x + pixel.X]);

    /// <summary>Plants a shape that fits at a place; a pixel whose charge rounds to nothing is not one.</summary>
    /// <param name="truth">Receives a row for each pixel.</param>
    /// <param name="frame">Index of the frame.</param>
    /// <param name="kind">Kind, as the truth table names it.</param>
    /// <param name="shape">The shape.</param>
    /// <param name="x">Column of the shape's origin.</param>
    /// <param name="y">Row of the shape's origin.</param>
    /// <param name="height">ADU at share 1.</param>
    public void Plant(ImpulseTruth truth, int frame, string kind, IReadOnlyList<ImpulsePixel> shape, int x, int y, double height)
    {
        foreach (ImpulsePixel pixel in shape)
        {
            int column = x + pixel.X, row = y + pixel.Y;
            double electrons = Math.Round(height * pixel.Share * detector.Gain);
            if (electrons > 0)
            {
                Charge[(row * light.Width) + column] = electrons;
                truth.Add(frame, events, kind, column, row, electrons / detector.Gain,
                    (light[column, row] - sky) / detector.Gain, BrightestNear(column, row), BackgroundSigma, detector.Sigma(light[column, row]));
            }

            Take(column, row);
        }

        events++;
    }

    /// <summary>Plants a shape at a random place where it fits, with a random height in background sigmas.</summary>
    public void PlantAnywhere(ImpulseTruth truth, int frame, string kind, IReadOnlyList<ImpulsePixel> shape, RandomSource random)
    {
        double height = DrawHeight(random) * BackgroundSigma;
        int x, y;
        do
        {
            x = random.Index(light.Width);
            y = random.Index(light.Height);
        }
        while (!Fits(shape, x, y));
        Plant(truth, frame, kind, shape, x, y, height);
    }

    /// <summary>
    /// Plants a single hit, its height drawn as everywhere, within 2 px of a place that carries source light; nothing
    /// where another event is near.
    /// </summary>
    public void PlantOnLight(ImpulseTruth truth, int frame, double nearX, double nearY, RandomSource random)
    {
        int x = (int)Math.Round(nearX) + random.Index(5) - 2, y = (int)Math.Round(nearY) + random.Index(5) - 2;
        double height = DrawHeight(random) * BackgroundSigma;
        List<ImpulsePixel> shape = ImpulseShapes.Single();
        if (Fits(shape, x, y))
            Plant(truth, frame, "isolated", shape, x, y, height);
    }

    // The brightest source light within 4 px: the peak of the star a hit sits on, in ADU.
    private double BrightestNear(int x, int y)
    {
        double brightest = 0;
        for (int row = Math.Max(y - 4, 0); row <= Math.Min(y + 4, light.Height - 1); row++)
        {
            for (int column = Math.Max(x - 4, 0); column <= Math.Min(x + 4, light.Width - 1); column++)
                brightest = Math.Max(brightest, light[column, row] - sky);
        }

        return brightest / detector.Gain;
    }

    private void Take(int x, int y)
    {
        for (int row = Math.Max(y - Clearance, 0); row <= Math.Min(y + Clearance, light.Height - 1); row++)
        {
            for (int column = Math.Max(x - Clearance, 0); column <= Math.Min(x + Clearance, light.Width - 1); column++)
                taken[(row * light.Width) + column] = true;
        }
    }
}

/// <summary>The truth table of planted impulses: one row for each pixel.</summary>
internal sealed class ImpulseTruth
{
    private readonly TruthTable table = new(
        "frame", "event", "kind", "x_px", "y_px", "height_adu", "source_light_adu", "source_peak_adu", "on_source", "local_sigma_adu");

    /// <summary>Adds a pixel; it is on source light when that exceeds the background's sigma. Heights, light and sigmas in ADU.</summary>
    public void Add(
        int frame, int number, string kind, int x, int y, double height, double light, double peak, double backgroundSigma, double localSigma) =>
        table.Add(
            TruthTable.Number(frame), TruthTable.Number(number), kind, TruthTable.Number(x), TruthTable.Number(y),
            TruthTable.Number(height, 3), TruthTable.Number(light, 3), TruthTable.Number(peak, 3), light > backgroundSigma ? "1" : "0", TruthTable.Number(localSigma, 4));

    /// <summary>Writes the table.</summary>
    public void Save(string path) => table.Save(path);
}
