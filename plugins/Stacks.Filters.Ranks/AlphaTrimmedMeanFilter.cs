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
        private readonly RankNetwork middle;

        public Step(FrameLayout layout, int side, double trim, IReadOnlyList<ResolvedParameter> resolved)
            : base(layout, side, SampleFlags.Missing | SampleFlags.Saturated, resolved)
        {
            this.side = side;
            this.trim = trim;
            int cut = Cut(side * side, trim);
            kept = (side * side) - (2 * cut);
            middle = new RankNetwork(side * side, [.. Enumerable.Range(cut + 1, kept)]);
        }

        [SkipLocalsInit]
        protected override void Compute(Windows<T> windows, int y, int first, Span<T> result, Span<int> counts)
        {
            // As many pixels at once as the widest vector holds: all kept ranks of more would not fit the stack.
            int pixels = 64 / Unsafe.SizeOf<T>(), radius = side / 2;
            Span<T> ranks = stackalloc T[side * side * pixels];
            for (int from = 0; from < result.Length; from += pixels)
            {
                int x = first + from, length = Math.Min(pixels, result.Length - from);
                WindowRanks.Row(windows, side, middle, y, x, x + length, ranks);
                for (int i = 0; i < length; i++)
                {
                    result[from + i] = Rounding.ToSample<T>(Mean<T>(ranks[i..(((kept - 1) * length) + i + 1)], length));
                    counts[from + i] = side * side;
                }

                for (int i = 0; i < length && !windows.AllTakePart; i++)
                {
                    if (!windows.AllTakePartIn(x + i - radius, x + i + radius + 1, y - radius, y + radius + 1))
                        counts[from + i] = Partial(ranks[..windows.Gather(x + i, y, radius, ranks)], ref result[from + i]);
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
