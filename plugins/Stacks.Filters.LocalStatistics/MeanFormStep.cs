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
    public long ScratchBytes => Environment.ProcessorCount * (WindowMoments.ScratchBytes<T>(side) + (sizeof(double) * (long)layout.Width));

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        NoiseModel noise = context.Noise ?? throw new InvalidOperationException("local statistics need a noise model");
        SampleFlags without = context.HasMissing || context.HasSaturated ? Outsiders : SampleFlags.None;
        WindowMoments<T> moments = new(input, flags, without, side, context.Scratch) { Lanes = Lanes };
        context.Bands.ForEach(input.Height, (first, end) =>
        {
            Plane<double> variances = context.Scratch.Rent<double>(input.Width, 1);
            moments.Rows(first, end, (x, y, means, squares, counts) =>
            {
                context.Cancellation.ThrowIfCancellationRequested();
                Span<double> noises = variances.Samples[..means.Length];
                noise.VarianceByRow(x, y, means, noises);
                Shrinkage.Row(input.Row(y).Slice(x, means.Length), means, noises, squares, counts, output.Row(y).Slice(x, means.Length), Lanes);
            });
        });
    }
}
