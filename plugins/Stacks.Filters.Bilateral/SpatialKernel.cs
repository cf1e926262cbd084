using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The places q of a Gaussian in space around p: a disc of radius 4.5 ss, as far as the frame can hold it. It leaves out
/// exp(-4.5^2 / 2) = 4e-5 of the weight, a square of half-width 4 ss 1.3e-4 with up to a sixth more places, a disc of radius
/// 4 ss 3.4e-4.
/// </summary>
internal sealed class SpatialKernel
{
    /// <summary>Radius of the disc in ss.</summary>
    public const double Cut = 4.5;

    private readonly int[] halfWidths;
    private readonly int[] heights;
    private readonly double sigma;

    /// <summary>A kernel for frames of one shape.</summary>
    /// <param name="sigma">ss in samples.</param>
    /// <param name="width">Frame width.</param>
    /// <param name="height">Frame height.</param>
    public SpatialKernel(double sigma, int width, int height)
    {
        this.sigma = sigma;
        double radius = Cut * sigma;
        RadiusX = (int)Math.Min(radius, width - 1);
        RadiusY = (int)Math.Min(radius, height - 1);
        Width = width;
        Height = height;
        Stride = checked(RealLanes.Padded(width) + (2 * RadiusX));
        halfWidths = [.. Enumerable.Range(0, RadiusY + 1).Select(dy => (int)Math.Min(Math.Sqrt((radius * radius) - ((double)dy * dy)), RadiusX))];
        heights = [.. Enumerable.Range(0, RadiusX + 1).Select(dx => (int)Math.Min(Math.Sqrt((radius * radius) - ((double)dx * dx)), RadiusY))];
    }

    /// <summary>Frame width.</summary>
    public int Width { get; }

    /// <summary>Frame height.</summary>
    public int Height { get; }

    /// <summary>Reach along x in samples.</summary>
    public int RadiusX { get; }

    /// <summary>Reach along y in samples.</summary>
    public int RadiusY { get; }

    /// <summary>Samples in a row of a padded plane: the frame's width in whole vectors, and <see cref="RadiusX"/> on either side.</summary>
    public int Stride { get; }

    /// <summary>Reach along x in the rows dy = 0 ... <see cref="RadiusY"/> away.</summary>
    public ReadOnlySpan<int> HalfWidths => halfWidths;

    /// <summary>Reach along y in the columns dx = 0 ... <see cref="RadiusX"/> away.</summary>
    public ReadOnlySpan<int> Heights => heights;

    /// <summary>Rows of a padded plane: the frame's, and as many below as a pair of rows reaches behind the last.</summary>
    public int PaddedHeight => Height + RadiusY + 2;

    /// <summary>log2 of the weight in space of every place: rows dy = 0 ... RadiusY, columns dx = -RadiusX ... RadiusX.</summary>
    public T[] Exponents<T>(Func<double, T> rounded)
    {
        int side = (2 * RadiusX) + 1;
        T[] exponents = new T[side * (RadiusY + 1)];
        for (int i = 0; i < exponents.Length; i++)
        {
            double dx = (i % side) - RadiusX, dy = i / side;
            exponents[i] = rounded(-((dx * dx) + (dy * dy)) * Math.Log2(Math.E) / (2 * sigma * sigma));
        }

        return exponents;
    }
}
