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
    private readonly QuartileKernels kernels = new(rules.LargestWindow);

    /// <inheritdoc/>
    public int? Reach => Replacement<T>.LargestRadius + (rules.LargestWindow / 2);

    /// <inheritdoc/>
    public long ScratchBytes =>
        ReflectedRows.ScratchBytes(layout.Width, layout.Height, rules.LargestWindow / 2) + layout.Length
        + kernels.ScratchBytes<T>() + ClearPixels<T>.ScratchBytes;

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => rules.Resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        NoiseModel noise = context.Noise ?? throw new InvalidOperationException("adaptive-median needs a noise model");
        ReflectedRows<T> rows = new(input, flags, ImpulseSearch<T>.TakeNoPart, rules.LargestWindow / 2, context.Scratch);
        Plane<SampleFlags> judged = context.Scratch.Rent<SampleFlags>(input.Width, input.Height);

        ImpulseSearch<T> search = new(rules, kernels, rows, noise);
        context.Bands.ForEach(input.Height, (first, end) => search.Judge(flags, judged, first, end, context));

        context.Bands.ForEach(input.Height, (first, end) =>
        {
            context.Cancellation.ThrowIfCancellationRequested();
            Replacement<T>.Replace(input, judged, flags, output, first, end);
        });
    }
}
