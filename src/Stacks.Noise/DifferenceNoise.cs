using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
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

    private const int Beyond = 16; // rows are computed in whole vectors; what stands behind their ends is not looked at
    private const SampleFlags Unusable = SampleFlags.Missing | SampleFlags.Saturated;

    /// <summary>Bytes of scratch that measuring a frame rents, at most.</summary>
    public static long ScratchBytes(int width, int height) =>
        (2 * sizeof(double) * Math.Min((long)width * height, MostResponses + (2L * width)))
        + (7 * sizeof(double) * ((long)width + Beyond))
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
        Plane<double> rowsOfThree = scratch.Rent<double>(width + Beyond, 3);
        Span<double> row = scratch.Rent<double>(width + Beyond, 1).Samples, rowRatios = scratch.Rent<double>(width + Beyond, 1).Samples;
        Span<double> levels = scratch.Rent<double>(width + Beyond, 1).Samples, variances = scratch.Rent<double>(width + Beyond, 1).Samples;
        Span<int> counts = scratch.Rent<int>(RankSelection.Counts, 1).Samples;

        int count = 0;
        for (int y = stepY; y < values.Height - stepY; y += stride)
        {
            for (int k = -1; k <= 1; k++)
                ToDouble<T>(values.Row(y + (k * stepY)), rowsOfThree.Row(k + 1));
            Respond(rowsOfThree, stepX, columns, quantisationStep, row, levels);
            for (int k = -1; k <= 1; k++)
                Void(flags.Row(y + (k * stepY)), stepX, row[..columns], levels);
            if (model is not null)
            {
                model.VarianceByRow(stepX, y, levels[..columns], variances[..columns]);
                Compare(row, variances, columns, rowRatios);
            }

            for (int x = 0; x < columns; x++)
            {
                if (!double.IsFinite(row[x]))
                    continue;
                if (model is not null)
                    ratios[count] = rowRatios[x];
                responses[count++] = row[x];
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

    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static void ToDouble<T>(ReadOnlySpan<T> samples, Span<double> values)
        where T : unmanaged, INumber<T>
    {
        for (int x = 0; x < samples.Length; x++)
            values[x] = double.CreateTruncating(samples[x]);
    }

    /// <summary>
    /// Responses of one row and the means of their nine samples, the first of them those of column <paramref name="stepX"/>.
    /// Six times a response is a whole number of steps; rounding makes equal ones equal to the bit.
    /// </summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static void Respond(Plane<double> three, int stepX, int columns, double quantisationStep, Span<double> responses, Span<double> levels)
    {
        ReadOnlySpan<double> above = three.Row(0), here = three.Row(1), below = three.Row(2);
        for (int x = 0; x < columns; x += Vector512<double>.Count)
        {
            Vector512<double> corners = At(above, x) + At(above, x + (2 * stepX)) + (At(below, x) + At(below, x + (2 * stepX)));
            Vector512<double> sides = At(above, x + stepX) + At(here, x) + (At(here, x + (2 * stepX)) + At(below, x + stepX));
            Vector512<double> centre = At(here, x + stepX);
            Vector512<double> response = (corners - (2 * sides) + (4 * centre)) / Vector512.Create(6.0);
            if (quantisationStep > 0)
                response = Vector512.Round(response * 6 / Vector512.Create(quantisationStep)) * quantisationStep / Vector512.Create(6.0);
            response.CopyTo(responses[x..]);
            Vector512<double> level = (corners + sides + centre) / Vector512.Create(9.0);
            level.CopyTo(levels[x..]);
        }
    }

    /// <summary>NaN and 0 where a response has an unusable sample in a row of flags.</summary>
    private static void Void(ReadOnlySpan<SampleFlags> flags, int stepX, Span<double> responses, Span<double> levels)
    {
        for (int i = MemoryMarshal.AsBytes(flags).IndexOfAnyExcept((byte)0); i >= 0;)
        {
            for (int x = i - (2 * stepX); (flags[i] & Unusable) != 0 && x <= i; x += stepX)
            {
                if (x < 0 || x >= responses.Length)
                    continue;
                responses[x] = double.NaN;
                levels[x] = 0;
            }

            int next = MemoryMarshal.AsBytes(flags[(i + 1)..]).IndexOfAnyExcept((byte)0);
            i = next < 0 ? -1 : i + 1 + next;
        }
    }

    /// <summary>Responses in units of the model's noise.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static void Compare(ReadOnlySpan<double> responses, ReadOnlySpan<double> variances, int columns, Span<double> ratios)
    {
        for (int x = 0; x < columns; x += Vector512<double>.Count)
            (At(responses, x) / Vector512.Sqrt(At(variances, x))).CopyTo(ratios[x..]);
    }

    private static Vector512<double> At(ReadOnlySpan<double> row, int x) => Vector512.Create(row.Slice(x, Vector512<double>.Count));
}
