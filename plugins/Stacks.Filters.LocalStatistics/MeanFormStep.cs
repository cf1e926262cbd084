using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.LocalStatistics;

/// <summary>
/// Local mean and sample variance (divisor n - 1) of the samples that take part: neither missing nor saturated.
/// Computed in double and rounded once.
/// </summary>
internal sealed class MeanFormStep<T>(FrameLayout layout, int side, IReadOnlyList<ResolvedParameter> resolved) : IFilterStep<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const SampleFlags Outsiders = SampleFlags.Missing | SampleFlags.Saturated;

    /// <summary>Lanes to compute with; results are the same bits.</summary>
    public int Lanes { get; init; } = DoubleLanes.Widest;

    /// <inheritdoc/>
    public int? Reach => side / 2;

    /// <inheritdoc/>
    public long ScratchBytes => 2 * Windows.ScratchBytes<double>(layout.Width, layout.Height, side / 2);

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        NoiseModel noise = context.Noise ?? throw new InvalidOperationException("local statistics need a noise model");
        Windows<double> values = Windows.Computed<double>(
            input.Width,
            input.Height,
            (y, row) =>
            {
                for (int x = 0; x < row.Length; x++)
                    row[x] = (flags[x, y] & Outsiders) == 0 ? double.CreateTruncating(input[x, y]) : 0;
            },
            side / 2,
            context.Scratch,
            context.Bands);
        Windows<double> masses = Windows.Computed<double>(
            input.Width,
            input.Height,
            (y, row) =>
            {
                for (int x = 0; x < row.Length; x++)
                    row[x] = (flags[x, y] & Outsiders) == 0 ? 1 : 0;
            },
            side / 2,
            context.Scratch,
            context.Bands);

        context.Bands.ForEach(input.Height, (first, end) =>
        {
            Plane<double> moments = context.Scratch.Rent<double>(input.Width, 3);
            Span<double> means = moments.Row(0), squares = moments.Row(1), counts = moments.Row(2);
            for (int y = first; y < end; y++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                DoubleLanes.Run(new WindowMoments(values, masses, side, y, means, squares, counts), input.Width, Lanes);
                for (int x = 0; x < means.Length; x++)
                {
                    output[x, y] = (flags[x, y] & Outsiders) != 0 || counts[x] < Shrinkage.LeastCount
                        ? input[x, y]
                        : T.CreateTruncating(Shrinkage.Of(
                            values[x, y], means[x], noise.Variance(x, y, means[x]), squares[x] / (counts[x] - 1)));
                }
            }
        });
    }
}
