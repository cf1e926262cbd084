namespace Stacks.Filters.Bilateral;

/// <summary>
/// The places q of a Gaussian in space around p, row after row and column after column: up to 4 ss away along x and
/// along y, as far as the frame can hold them.
/// </summary>
internal sealed class SpatialKernel
{
    private readonly int[] firstOfRow;

    /// <summary>A kernel for frames of one shape.</summary>
    /// <param name="sigma">ss in samples.</param>
    /// <param name="width">Frame width.</param>
    /// <param name="height">Frame height.</param>
    public SpatialKernel(double sigma, int width, int height)
    {
        double cut = Math.Floor(4 * sigma);
        RadiusX = (int)Math.Min(cut, width - 1);
        RadiusY = (int)Math.Min(cut, height - 1);
        Width = width;
        Height = height;
        Stride = checked(width + (2 * RadiusX));

        List<int> offsets = [];
        List<double> exponents = [];
        firstOfRow = new int[(2 * RadiusY) + 2];
        for (int dy = -RadiusY; dy <= RadiusY; dy++)
        {
            firstOfRow[dy + RadiusY] = offsets.Count;
            for (int dx = -RadiusX; dx <= RadiusX; dx++)
            {
                double squared = ((double)dx * dx) + ((double)dy * dy);
                offsets.Add((dy * Stride) + dx);
                exponents.Add(squared * Math.Log2(Math.E) / (2 * sigma * sigma));
            }
        }

        firstOfRow[^1] = offsets.Count;
        Offsets = [.. offsets];
        Exponents = [.. exponents];
    }

    /// <summary>Frame width.</summary>
    public int Width { get; }

    /// <summary>Frame height.</summary>
    public int Height { get; }

    /// <summary>Reach along x in samples.</summary>
    public int RadiusX { get; }

    /// <summary>Reach along y in samples.</summary>
    public int RadiusY { get; }

    /// <summary>Samples in a row of a padded plane: the frame's width and <see cref="RadiusX"/> on either side.</summary>
    public int Stride { get; }

    /// <summary>Distance in a padded plane from p to each q.</summary>
    public int[] Offsets { get; }

    /// <summary>|p-q|^2 log2(e) / 2 ss^2 for each q: its weight in space is 2 to minus this.</summary>
    public double[] Exponents { get; }

    /// <summary>The range [first, end) of places that lie in the frame when p is in row <paramref name="y"/>.</summary>
    public (int First, int End) PlacesOfRow(int y) =>
        (firstOfRow[Math.Max(0, RadiusY - y)], firstOfRow[Math.Min(2 * RadiusY, Height - 1 - y + RadiusY) + 1]);
}
