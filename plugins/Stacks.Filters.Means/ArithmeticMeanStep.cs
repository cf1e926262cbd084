using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Means;

/// <summary>
/// y = sum v / n over square windows, in a time that hardly depends on the window (<see cref="WindowMoments{T}"/>).
/// Missing and saturated samples take no part and stay as stored. Computed in double and rounded once.
/// </summary>
internal sealed class ArithmeticMeanStep<T>(int side, IReadOnlyList<ResolvedParameter> resolved) : IFilterStep<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    /// <inheritdoc/>
    public int? Reach => side / 2;

    /// <inheritdoc/>
    public long ScratchBytes => Environment.ProcessorCount * WindowMoments.ScratchBytes<T>(side);

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        SampleFlags without = context.HasMissing || context.HasSaturated ? SampleFlags.Missing | SampleFlags.Saturated : SampleFlags.None;
        WindowMoments<T> moments = new(input, flags, without, side, context.Scratch);
        context.Bands.ForEach(input.Height, (first, end) => moments.Rows(first, end, (x, y, means, _, counts) =>
        {
            context.Cancellation.ThrowIfCancellationRequested();
            ReadOnlySpan<T> own = input.Row(y).Slice(x, means.Length);
            Span<T> result = output.Row(y).Slice(x, means.Length);
            for (int i = 0; i < means.Length; i++)
                result[i] = counts[i] == 0 ? own[i] : T.CreateTruncating(means[i]);
        }));
    }
}
