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
    private const ushort LeastCount = 3;
    private const SampleFlags Untouched = SampleFlags.Missing | SampleFlags.Saturated;

    /// <inheritdoc/>
    public int? Reach => side / 2;

    /// <inheritdoc/>
    public long ScratchBytes => ReflectedRows.ScratchBytes(layout.Width, layout.Height, side / 2) + BandScratchBytes;

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <summary>Bytes that <see cref="Compute"/> rents.</summary>
    protected abstract long BandScratchBytes { get; }

    /// <summary>Computes the pixels of rows [first, end), and leaves to <see cref="Keep"/> those that must not change.</summary>
    protected abstract void Compute(ReflectedRows<T> rows, int first, int end, FramePart<T> frame, FrameContext context);

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        ReflectedRows<T> rows = new(input, flags, without, side / 2, context.Scratch);
        context.Bands.ForEach(input.Height, (first, end) =>
            Compute(rows, first, end, new FramePart<T>(input, flags, output), context));
    }

    /// <summary>Puts back the pixels from column <paramref name="x"/> of row <paramref name="y"/> on that stay as they are.</summary>
    /// <param name="frame">The frame.</param>
    /// <param name="x">First column.</param>
    /// <param name="y">Row.</param>
    /// <param name="counts">Samples that took part in each window.</param>
    /// <param name="full">What each of them is when no sample of the frame is without part.</param>
    protected static void Keep(FramePart<T> frame, int x, int y, ReadOnlySpan<ushort> counts, bool full)
    {
        ReadOnlySpan<SampleFlags> known = frame.Flags.Row(y).Slice(x, counts.Length);
        if (full && !FlagSearch.Any(known, Untouched))
            return;
        ReadOnlySpan<T> samples = frame.Input.Row(y).Slice(x, counts.Length);
        Span<T> results = frame.Output.Row(y).Slice(x, counts.Length);
        for (int i = 0; i < counts.Length; i++)
        {
            if (counts[i] < LeastCount || (known[i] & Untouched) != 0)
                results[i] = samples[i];
        }
    }
}

/// <summary>The planes of a frame.</summary>
internal readonly record struct FramePart<T>(Plane<T> Input, Plane<SampleFlags> Flags, Plane<T> Output)
    where T : unmanaged;
