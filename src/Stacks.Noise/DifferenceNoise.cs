using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Noise;

/// <summary>What the difference mask says about one frame.</summary>
/// <param name="Sigma">Noise sigma in value units, quantisation noise included; NaN when not measurable.</param>
/// <param name="Ratio">Measured noise over the model's at the local level; NaN when not measurable or without a model.</param>
public readonly record struct NoiseMeasurement(double Sigma, double Ratio);

/// <summary>
/// Noise of a frame from its differences: the mask (1 -2 1; -2 4 -2; 1 -2 1) / 6 (Immerkaer, Computer Vision and Image
/// Understanding 64 (1996) 300) answers 0 on any f(x) + g(y), and white noise of sigma s with a sigma of s. Its answers are taken robustly (see <see cref="Spread"/>), so that sources, edges and
/// impulses hardly count. On a mosaic the mask steps by the mosaic's period.
/// </summary>
public static class DifferenceNoise
{
    /// <summary>Fewer responses than this measure nothing.</summary>
    public const int LeastResponses = 100;

    /// <summary>
    /// Of large frames evenly spaced rows are used, the same ones every time, until about this many responses; the
    /// standard error of sigma is then about 0.6 %.
    /// </summary>
    public const int MostResponses = 1 << 17;

    private const SampleFlags Unusable = SampleFlags.Missing | SampleFlags.Saturated;

    /// <summary>Bytes of scratch that measuring a frame rents, at most.</summary>
    public static long ScratchBytes(int width, int height) =>
        (2 * sizeof(double) * Math.Min((long)width * height, MostResponses + (2L * width)))
        + (3 * sizeof(double) * (long)width)
        + (sizeof(int) * (long)RankSelection.Counts);

    /// <summary>Measures a frame.</summary>
    /// <param name="values">Values.</param>
    /// <param name="flags">Flags; a response with a missing or saturated sample is left out.</param>
    /// <param name="lattice">The frame's mosaic.</param>
    /// <param name="quantisationStep">q in value units; 0 for continuous samples.</param>
    /// <param name="model">A model to compare with; null for none.</param>
    /// <param name="scratch">Scratch.</param>
    public static NoiseMeasurement Measure<T>(
        Plane<T> values, Plane<SampleFlags> flags, Lattice lattice, double quantisationStep, NoiseModel? model, IScratch scratch)
        where T : unmanaged, INumber<T>
    {
        int width = values.Width, stepX = lattice.PeriodX, stepY = lattice.PeriodY;
        int rows = values.Height - (2 * stepY), columns = width - (2 * stepX);
        if (rows < 1 || columns < 1)
            return new NoiseMeasurement(double.NaN, double.NaN);

        // A stride of 1 more than a multiple of the period visits the rows of every sub-lattice in turn.
        long wanted = (((long)rows * columns) + MostResponses - 1) / MostResponses;
        int stride = 1 + ((int)((wanted - 1 + stepY - 1) / stepY) * stepY);
        int visited = (rows + stride - 1) / stride;
        Span<double> responses = scratch.Rent<double>(visited * columns, 1).Samples;
        Span<double> ratios = model is null ? [] : scratch.Rent<double>(visited * columns, 1).Samples;
        Span<double> row = scratch.Rent<double>(width, 1).Samples;
        Span<double> levels = scratch.Rent<double>(width, 1).Samples;
        Span<double> variances = scratch.Rent<double>(width, 1).Samples;
        Span<int> counts = scratch.Rent<int>(RankSelection.Counts, 1).Samples;

        int count = 0;
        for (int y = stepY; y < values.Height - stepY; y += stride)
        {
            Respond(values, flags, stepX, stepY, y, row, levels);
            model?.VarianceByRow(0, y, levels, variances);
            for (int x = stepX; x < width - stepX; x++)
            {
                if (!double.IsFinite(row[x]))
                    continue;
                // Six times a response is a whole number of steps; rounding makes equal ones equal to the bit.
                double response = quantisationStep > 0 ? Math.Round(row[x] * 6 / quantisationStep) * quantisationStep / 6 : row[x];
                if (model is not null)
                    ratios[count] = response / Math.Sqrt(variances[x]);
                responses[count++] = response;
            }
        }

        if (count < LeastResponses)
            return new NoiseMeasurement(double.NaN, double.NaN);
        double sigma = Spread.Of(responses[..count], counts, out bool coarse);
        double ratio = model is null ? double.NaN
            : coarse ? Spread.WithinFewSigmas(ratios[..count], 1)
            : Spread.Of(ratios[..count], counts, out _);
        return new NoiseMeasurement(sigma, ratio);
    }

    /// <summary>Responses of one row and the means of their nine samples; NaN and 0 where a sample is unusable.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static void Respond<T>(
        Plane<T> values, Plane<SampleFlags> flags, int stepX, int stepY, int y, Span<double> responses, Span<double> levels)
        where T : unmanaged, INumber<T>
    {
        ReadOnlySpan<T> above = values.Row(y - stepY), here = values.Row(y), below = values.Row(y + stepY);
        ReadOnlySpan<SampleFlags> flagsAbove = flags.Row(y - stepY), flagsHere = flags.Row(y), flagsBelow = flags.Row(y + stepY);
        levels.Clear();
        for (int x = stepX; x < here.Length - stepX; x++)
        {
            int w = x - stepX, e = x + stepX;
            SampleFlags any = flagsAbove[w] | flagsAbove[x] | flagsAbove[e] | flagsHere[w] | flagsHere[x] | flagsHere[e]
                | flagsBelow[w] | flagsBelow[x] | flagsBelow[e];
            if ((any & Unusable) != 0)
            {
                responses[x] = double.NaN;
                continue;
            }

            double corners = Sum(above[w], above[e], below[w], below[e]);
            double sides = Sum(above[x], here[w], here[e], below[x]);
            double centre = double.CreateTruncating(here[x]);
            responses[x] = (corners - (2 * sides) + (4 * centre)) / 6;
            levels[x] = (corners + sides + centre) / 9;
        }
    }

    private static double Sum<T>(T a, T b, T c, T d)
        where T : unmanaged, INumber<T> =>
        double.CreateTruncating(a) + double.CreateTruncating(b) + (double.CreateTruncating(c) + double.CreateTruncating(d));
}
