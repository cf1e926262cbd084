namespace Stacks.Filters.Bilateral;

/// <summary>
/// The places q of a Gaussian in space around p, row after row and column after column: up to 4 ss away along x and
/// along y, as far as the frame can hold them.
/// </summary>
internal sealed class SpatialKernel
{
    private readonly int[] offsets;
    private readonly double[] exponents;

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

        offsets = new int[((2 * RadiusX) + 1) * ((2 * RadiusY) + 1)];
        exponents = new double[offsets.Length];
        int next = 0;
        for (int dy = -RadiusY; dy <= RadiusY; dy++)
        {
            for (int dx = -RadiusX; dx <= RadiusX; dx++, next++)
            {
                offsets[next] = (dy * Stride) + dx;
                exponents[next] = (((double)dx * dx) + ((double)dy * dy)) * Math.Log2(Math.E) / (2 * sigma * sigma);
            }
        }
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

    /// <summary>Distances in a padded plane from p in row <paramref name="y"/> to each q in the frame's rows.</summary>
    public ReadOnlySpan<int> OffsetsOfRow(int y) => offsets.AsSpan(InFrame(y));

    /// <summary>|p-q|^2 log2(e) / 2 ss^2 for the same q: the weight in space is 2 to minus this.</summary>
    public ReadOnlySpan<double> ExponentsOfRow(int y) => exponents.AsSpan(InFrame(y));

    private Range InFrame(int y)
    {
        int rowLength = (2 * RadiusX) + 1;
        return (Math.Max(0, RadiusY - y) * rowLength)..((Math.Min(RadiusY, Height - 1 - y) + RadiusY + 1) * rowLength);
    }
}
