using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Ranks;

/// <summary>
/// A filter that computes each pixel from the samples of its window that take part. Missing and saturated pixels, and
/// those with fewer than 3 samples in their window, stay as they are.
/// </summary>
/// <param name="layout">The frame.</param>
/// <param name="side">Side of the window, odd.</param>
/// <param name="without">Samples with any of these flags take no part.</param>
/// <param name="resolved">Parameters for the record.</param>
internal abstract class WindowStep<T>(FrameLayout layout, int side, SampleFlags without, IReadOnlyList<ResolvedParameter> resolved) : IFilterStep<T>
    where T : unmanaged, INumber<T>
{
    /// <summary>Most pixels that <see cref="Compute"/> is asked for at once.</summary>
    protected const int Block = 64;

    private const int LeastCount = 3;

    /// <inheritdoc/>
    public int? Reach => side / 2;

    /// <inheritdoc/>
    public long ScratchBytes => Windows.ScratchBytes<T>(layout.Width, layout.Height, side / 2);

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <summary>Computes pixels [first, first + result.Length) of row <paramref name="y"/>.</summary>
    /// <param name="windows">The frame.</param>
    /// <param name="y">Row.</param>
    /// <param name="first">First column.</param>
    /// <param name="result">Receives the values, at most <see cref="Block"/>.</param>
    /// <param name="counts">Receives how many samples took part; below 3 the value does not count.</param>
    protected abstract void Compute(Windows<T> windows, int y, int first, Span<T> result, Span<int> counts);

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        Windows<T> windows = Windows.Of(input, flags, without, side / 2, context.Scratch, context.Bands);
        context.Bands.ForEach(input.Height, (first, end) =>
        {
            Span<int> counts = stackalloc int[Block];
            for (int y = first; y < end; y++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                for (int x = 0; x < input.Width; x += Block)
                {
                    Span<T> result = output.Row(y)[x..Math.Min(x + Block, input.Width)];
                    Compute(windows, y, x, result, counts[..result.Length]);
                    for (int i = 0; i < result.Length; i++)
                    {
                        if (counts[i] < LeastCount || (flags[x + i, y] & (SampleFlags.Missing | SampleFlags.Saturated)) != 0)
                            result[i] = input[x + i, y];
                    }
                }
            }
        });
    }
}
