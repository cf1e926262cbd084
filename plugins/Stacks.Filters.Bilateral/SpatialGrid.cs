namespace Stacks.Filters.Bilateral;

/// <summary>
/// A coarse grid over a frame, h samples to a cell, that stands for a Gaussian in space: a sample is spread to 4 x 4
/// nodes by the cubic B-spline, nodes are blurred, and read at a sample's place by the same spline. Spreading and reading
/// are transposes, so what p gives q, q gets from p. The blur's spectrum is the Gaussian's divided by both splines',
/// exp(-2 pi^2 (ss/h)^2 f^2) / sinc(f)^8 with f in cycles a cell, so that only aliases of the spline remain as an error,
/// (h / 2 pi ss)^4 of the kernel's peak (Unser, IEEE Signal Processing Magazine 16 (1999) 22).
/// </summary>
internal sealed class SpatialGrid
{
    /// <summary>Nodes a sample is spread to along an axis.</summary>
    public const int Support = 4;

    private const int FewestSlots = 3 * LevelWeights.Lanes;

    private const int SpectrumSamples = 1024;

    /// <summary>A grid for frames of one shape.</summary>
    /// <param name="sigma">ss in samples.</param>
    /// <param name="pitch">h in samples.</param>
    /// <param name="width">Frame width.</param>
    /// <param name="height">Frame height.</param>
    public SpatialGrid(double sigma, int pitch, int width, int height)
    {
        (Sigma, Pitch, Width, Height) = (sigma, pitch, width, height);
        TilesX = ((width - 1) / pitch) + 1;
        TilesY = ((height - 1) / pitch) + 1;
        Spline = new float[pitch * Support];
        for (int i = 0; i < pitch; i++)
        {
            double t = (double)i / pitch, u = 1 - t;
            Spline[(Support * i) + 0] = (float)(u * u * u / 6);
            Spline[(Support * i) + 1] = (float)(((((3 * t) - 6) * t * t) + 4) / 6);
            Spline[(Support * i) + 2] = (float)(((((3 * u) - 6) * u * u) + 4) / 6);
            Spline[(Support * i) + 3] = (float)(t * t * t / 6);
        }

        Blur = BlurOf(sigma / pitch);
        Near = [.. Enumerable.Range(0, (int)(6 * sigma) + 1).Select(d => Math.Exp(-((double)d * d) / (2 * sigma * sigma)))];
    }

    /// <summary>The grid for a tolerance in range sigmas: h about ss / 3.5, or ss / 5 below 5e-4, but at least 2.</summary>
    public static SpatialGrid Of(double sigma, double tolerance, int width, int height)
    {
        double pitch = tolerance >= 5e-4 ? Math.Max(sigma / 3.5, Math.Min(sigma / 2.5, 4)) : sigma / 5;
        return new SpatialGrid(sigma, Math.Max(2, (int)pitch), width, height);
    }

    /// <summary>ss in samples.</summary>
    public double Sigma { get; }

    /// <summary>h in samples: a tile of h x h samples shares its 4 x 4 nodes.</summary>
    public int Pitch { get; }

    /// <summary>Frame width.</summary>
    public int Width { get; }

    /// <summary>Frame height.</summary>
    public int Height { get; }

    /// <summary>Tiles along x.</summary>
    public int TilesX { get; }

    /// <summary>Tiles along y.</summary>
    public int TilesY { get; }

    /// <summary>Nodes along x; tile i uses nodes i to i + 3.</summary>
    public int NodesX => TilesX + Support - 1;

    /// <summary>Nodes along y.</summary>
    public int NodesY => TilesY + Support - 1;

    /// <summary>The spline's four weights for each place of a sample in its tile along an axis.</summary>
    public float[] Spline { get; }

    /// <summary>Half of the blur, from its middle on.</summary>
    public double[] Blur { get; }

    /// <summary>exp(-d^2 / 2 ss^2) for distances d of whole samples, to 6 ss.</summary>
    public double[] Near { get; }

    /// <summary>Whether the nodes of so large a frame fit in 1 GB with the fewest slots.</summary>
    public bool IsHeld => (long)NodesX * NodesY * FewestSlots * 2 * sizeof(float) <= 1L << 30;

    /// <summary>Slots of range levels in memory at once, a multiple of sixteen: what 256 MB hold.</summary>
    public int MostSlots => (int)Math.Clamp((1L << 28) / (2L * sizeof(float) * NodesX * NodesY), FewestSlots, 1024) / LevelWeights.Lanes * LevelWeights.Lanes;

    /// <summary>
    /// Members up to which a level costs less pair by pair than on the grid: pairs grow with the square, the grid's work
    /// with its nodes.
    /// </summary>
    public int ThinMembers => (int)(3 * Math.Sqrt((double)NodesX * NodesY));

    /// <summary>Samples on thin levels at most; where there are more, fewer levels count as thin.</summary>
    public int ThinCapacity => Math.Max(1 << 14, Width * Height / 32);

    private static double[] BlurOf(double sigma)
    {
        List<double> taps = [];
        for (int n = 0; taps.Count < Support || taps[^1] > 1e-6 * taps[0]; n++)
        {
            double sum = 0;
            for (int i = 0; i < SpectrumSamples; i++)
            {
                double f = ((i + 0.5) / SpectrumSamples) - 0.5;
                double sinc = Math.Sin(Math.PI * f) / (Math.PI * f);
                sum += Math.Exp(-2 * Math.PI * Math.PI * sigma * sigma * f * f) / Math.Pow(sinc, 8) * Math.Cos(2 * Math.PI * n * f);
            }

            taps.Add(sum / SpectrumSamples * Math.Sqrt(2 * Math.PI) * sigma);
        }

        return [.. taps];
    }
}
