using System.Globalization;
using System.Numerics;
using System.Runtime.Intrinsics;

namespace Stacks.Abstractions;

/// <summary>
/// variance(v) = slope * max(v - pedestal, 0) + floor: shot noise over read noise, alike for every pixel.
/// Stabilisation: generalised Anscombe transform (Starck, Murtagh and Bijaoui, Image Processing and Data Analysis,
/// 1998), written so that it keeps its digits: with x = v - pedestal and c = 3/8 slope^2 + floor,
/// T = 2x / (sqrt(slope x + c) + sqrt(c)) for x &gt;= 0, x / sqrt(c) below.
/// </summary>
public sealed class LinearNoise : NoiseModel
{
    private readonly double c;
    private readonly double rootC;

    /// <summary>A model from its line.</summary>
    /// <param name="slope">Value units per electron (1 / gain); 0 or more.</param>
    /// <param name="floor">Variance at and below the pedestal, value units squared; above 0.</param>
    /// <param name="pedestal">Level without light, value units.</param>
    /// <exception cref="ArgumentOutOfRangeException">Slope below 0, or floor not above 0.</exception>
    public LinearNoise(double slope, double floor, double pedestal)
    {
        ArgumentOutOfRangeException.ThrowIfNegative(slope);
        ArgumentOutOfRangeException.ThrowIfNegativeOrZero(floor);
        Slope = slope;
        Floor = floor;
        Pedestal = pedestal;
        c = (0.375 * slope * slope) + floor;
        rootC = Math.Sqrt(c);
    }

    /// <summary>Value units per electron.</summary>
    public double Slope { get; }

    /// <summary>Variance at and below the pedestal, value units squared.</summary>
    public double Floor { get; }

    /// <summary>Level without light, value units.</summary>
    public double Pedestal { get; }

    /// <inheritdoc/>
    public override double LeastVariance => Floor;

    /// <summary>sigma^2 = max(v - pedestal, 0) / gain + (read noise / gain)^2 + q^2 / 12.</summary>
    /// <param name="gain">Electrons per value unit; above 0.</param>
    /// <param name="readNoise">Electrons rms; 0 or more.</param>
    /// <param name="pedestal">Level without light, value units.</param>
    /// <param name="quantisationStep">q in value units; 0 when the read noise was measured on the stored data.</param>
    public static LinearNoise FromCamera(double gain, double readNoise, double pedestal, double quantisationStep)
    {
        double read = readNoise / gain;
        return new LinearNoise(1 / gain, (read * read) + (quantisationStep * quantisationStep / 12), pedestal);
    }

    /// <summary>The same sigma at every level.</summary>
    public static LinearNoise Constant(double sigma) => new(0, sigma * sigma, 0);

    /// <inheritdoc/>
    public override double Variance(int x, int y, double level) => (Slope * Math.Max(level - Pedestal, 0)) + Floor;

    /// <inheritdoc/>
    public override void VarianceByRow(int x, int y, ReadOnlySpan<float> levels, Span<float> variances)
    {
        int i = 0;
        for (; i <= levels.Length - Vector512<float>.Count; i += Vector512<float>.Count)
        {
            // In double and rounded once, as the scalar form.
            (Vector512<double> low, Vector512<double> high) = Vector512.Widen(Vector512.Create(levels[i..]));
            Vector512.Narrow(Variance(low), Variance(high)).CopyTo(variances[i..]);
        }

        for (; i < levels.Length; i++)
            variances[i] = (float)Variance(x + i, y, levels[i]);
    }

    private Vector512<double> Variance(Vector512<double> level) =>
        (Slope * Vector512.Max(level - Vector512.Create(Pedestal), Vector512<double>.Zero)) + Vector512.Create(Floor);

    /// <inheritdoc/>
    public override void VarianceByRow(int x, int y, ReadOnlySpan<double> levels, Span<double> variances)
    {
        int i = 0;
        for (; i <= levels.Length - Vector512<double>.Count; i += Vector512<double>.Count)
            Variance(Vector512.Create(levels[i..])).CopyTo(variances[i..]);
        for (; i < levels.Length; i++)
            variances[i] = Variance(x + i, y, levels[i]);
    }

    /// <inheritdoc/>
    public override double Stabilise(int x, int y, double value)
    {
        double signal = value - Pedestal;
        return signal >= 0 ? 2 * signal / (Math.Sqrt((Slope * signal) + c) + rootC) : signal / rootC;
    }

    /// <inheritdoc/>
    public override void StabiliseByRow(int y, ReadOnlySpan<double> values, Span<double> stabilised)
    {
        int x = 0;
        Vector<double> pedestals = new(Pedestal), slopes = new(Slope), floors = new(c), roots = new(rootC);
        for (; x <= values.Length - Vector<double>.Count; x += Vector<double>.Count)
        {
            Vector<double> signal = new Vector<double>(values[x..]) - pedestals;
            Vector<double> above = (signal + signal) / (Vector.SquareRoot((slopes * signal) + floors) + roots);
            Vector.ConditionalSelect(Vector.GreaterThanOrEqual(signal, Vector<double>.Zero), above, signal / roots).CopyTo(stabilised[x..]);
        }

        for (; x < values.Length; x++)
            stabilised[x] = Stabilise(x, y, values[x]);
    }

    /// <inheritdoc/>
    public override string Describe() => Slope == 0
        ? string.Create(CultureInfo.InvariantCulture, $"sigma {Math.Sqrt(Floor):G6} ADU at every level")
        : string.Create(CultureInfo.InvariantCulture, $"variance {Slope:G6} ADU x (v - {Pedestal:G6} ADU) + {Floor:G6} ADU^2");
}
