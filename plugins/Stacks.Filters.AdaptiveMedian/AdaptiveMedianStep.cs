using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>
/// Two phases over the whole frame: first every pixel is judged by the samples as they came (<see cref="ImpulseSearch{T}"/>),
/// then the impulses are replaced from samples that no judgement spoke against (<see cref="Replacement{T}"/>).
/// </summary>
internal sealed class AdaptiveMedianStep<T>(FrameLayout layout, ImpulseRules rules) : IFilterStep<T>
    where T : unmanaged, INumber<T>
{
    private readonly WindowQuantiles[] quartiles =
        [.. from side in Enumerable.Range(1, rules.LargestWindow / 2) select new WindowQuantiles((2 * side) + 1, 0.25, 0.5, 0.75)];

    /// <inheritdoc/>
    public int? Reach => Replacement<T>.LargestRadius + (rules.LargestWindow / 2);

    /// <inheritdoc/>
    public long ScratchBytes =>
        Windows.ScratchBytes<T>(layout.Width, layout.Height, rules.LargestWindow / 2) + layout.Length;

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => rules.Resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        NoiseModel noise = context.Noise ?? throw new InvalidOperationException("adaptive-median needs a noise model");
        Windows<T> windows = Windows.Of(
            input, flags, ImpulseSearch<T>.TakeNoPart, rules.LargestWindow / 2, context.Scratch, context.Bands);
        Plane<SampleFlags> judged = context.Scratch.Rent<SampleFlags>(input.Width, input.Height);

        ImpulseSearch<T> search = new(rules, quartiles, windows, noise);
        context.Bands.ForEach(input.Height, (first, end) =>
        {
            context.Cancellation.ThrowIfCancellationRequested();
            search.Judge(flags, judged, first, end);
        });

        context.Bands.ForEach(input.Height, (first, end) =>
        {
            context.Cancellation.ThrowIfCancellationRequested();
            Replacement<T>.Replace(input, judged, flags, output, first, end);
        });
    }
}
