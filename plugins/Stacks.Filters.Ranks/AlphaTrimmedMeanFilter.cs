using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Ranks;

/// <summary>
/// y = mean of the window without its d / 2 lowest and d / 2 highest samples. d is a share of the n samples that take
/// part: d / 2 = floor(trim n / 2), and never so many that none is left. Summed in double in ascending order,
/// as differences from the lowest. An average: saturated samples take no part.
/// </summary>
public sealed class AlphaTrimmedMeanFilter : RankFilter
{
    private static readonly ParameterSpec Trim = new()
    {
        Name = "trim",
        Kind = ParameterKind.Number,
        Default = ParameterValue.Of(0.5),
        Minimum = 0,
        Maximum = 1,
        Meaning = "Share of the window's samples left out, half at each end: 0 is the arithmetic mean, 1 the median",
        WhenRaised = "more like the median: withstands more impulses, averages less",
        WhenLowered = "more like the mean: averages more, withstands fewer impulses",
    };

    /// <inheritdoc/>
    public override string Id => "alpha-trimmed-mean";

    /// <inheritdoc/>
    public override string Summary => "y = mean of the window without its d/2 lowest and d/2 highest samples, d / 2 = floor(trim n / 2)";

    /// <inheritdoc/>
    public override IReadOnlyList<ParameterSpec> Parameters { get; } = [Window, Trim];

    /// <inheritdoc/>
    public override IReadOnlyList<WorkType> WorkTypes { get; } = [WorkType.Float32, WorkType.Float64];

    private protected override WindowStep<T> Prepare<T>(FrameLayout layout, ParameterValues values) =>
        new Step<T>(layout, values.Integer(Window.Name), values.Number(Trim.Name), Resolve(values));

    /// <summary>Samples left out at each end of n; shares such as 0.4 are not binary fractions, hence the margin.</summary>
    private static int Cut(int count, double trim) => Math.Min((int)Math.Floor((trim * count / 2) + 1e-9), (count - 1) / 2);

    /// <summary>low + sum(v - low) / n of samples in ascending order, never beyond the highest: constants stay constant.</summary>
    private static double Mean<T>(ReadOnlySpan<T> sorted, int stride)
        where T : unmanaged, INumber<T>
    {
        double low = double.CreateTruncating(sorted[0]), high = double.CreateTruncating(sorted[^1]), sum = 0;
        for (int i = 0; i < sorted.Length; i += stride)
            sum += double.CreateTruncating(sorted[i]) - low;
        return Math.Min(low + (sum / (((sorted.Length - 1) / stride) + 1)), high);
    }

    private sealed class Step<T> : WindowStep<T>
        where T : unmanaged, INumber<T>
    {
        private readonly int side;
        private readonly double trim;
        private readonly int kept;
        private readonly WindowRanks middle;

        public Step(FrameLayout layout, int side, double trim, IReadOnlyList<ResolvedParameter> resolved)
            : base(layout, side, SampleFlags.Missing | SampleFlags.Saturated, resolved)
        {
            this.side = side;
            this.trim = trim;
            int cut = Cut(side * side, trim);
            kept = (side * side) - (2 * cut);
            middle = new WindowRanks(side, [.. Enumerable.Range(cut + 1, kept)]);
        }

        protected override long BandScratchBytes => 0;

        [SkipLocalsInit]
        protected override void Compute(ReflectedRows<T> rows, int first, int end, FramePart<T> frame, FrameContext context)
        {
            int pixels = WindowRanks.Pixels<T>(), radius = side / 2;
            Span<T> ranks = stackalloc T[side * side * pixels];
            Span<ushort> counts = stackalloc ushort[pixels];
            for (int y = first; y < end; y++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                for (int x = 0; x < rows.Width; x += pixels)
                {
                    Span<T> results = frame.Output.Row(y)[x..Math.Min(x + pixels, rows.Width)];
                    middle.At(rows, x, y, ranks);
                    for (int i = 0; i < results.Length; i++)
                    {
                        results[i] = Rounding.ToSample<T>(Mean<T>(ranks[i..(((kept - 1) * pixels) + i + 1)], pixels));
                        counts[i] = (ushort)(side * side);
                    }

                    for (int i = 0; i < results.Length && !rows.AllTakePart; i++)
                    {
                        if (!rows.AllTakePartIn(x + i, y, radius))
                            counts[i] = (ushort)Partial(ranks[..rows.Gather(x + i, y, radius, ranks)], ref results[i]);
                    }

                    Keep(frame, x, y, counts[..results.Length], rows.AllTakePart);
                }
            }
        }

        private int Partial(Span<T> samples, ref T result)
        {
            if (samples.Length == 0)
                return 0;
            samples.Sort();
            int cut = Cut(samples.Length, trim);
            result = Rounding.ToSample<T>(Mean<T>(samples[cut..^cut], 1));
            return samples.Length;
        }
    }
}
