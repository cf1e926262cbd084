using System.Globalization;
using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Means;

/// <summary>
/// Runs a <see cref="Mean"/> over square windows. Missing and saturated samples take no part and stay as stored, and so
/// does a pixel whose window has no weight. Computed in double and rounded once.
/// </summary>
/// <param name="layout">The frame.</param>
/// <param name="filter">Name of the filter, for errors.</param>
/// <param name="mean">The mean.</param>
/// <param name="weights">w, k * k of them, row after row.</param>
/// <param name="pedestal">Added to the values before and taken away after.</param>
/// <param name="resolved">Parameters for the record.</param>
internal sealed class MeanStep<T>(
    FrameLayout layout, string filter, Mean mean, double[] weights, double pedestal, IReadOnlyList<ResolvedParameter> resolved)
    : IFilterStep<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const SampleFlags Outsiders = SampleFlags.Missing | SampleFlags.Saturated;

    private readonly int side = (int)Math.Sqrt(weights.Length);

    /// <summary>Lanes to compute with; results are the same bits.</summary>
    public int Lanes { get; init; } = DoubleLanes.Widest;

    /// <inheritdoc/>
    public int? Reach => side / 2;

    /// <inheritdoc/>
    public long ScratchBytes => 2 * Windows.ScratchBytes<double>(layout.Width, layout.Height, side / 2);

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <inheritdoc/>
    /// <exception cref="StackFormatException">A value has no such mean.</exception>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        if (mean.NeedsPositive)
            RefuseOthers(input, flags, context.FrameIndex);

        Windows<double> Bordered(Func<double, double> ofValue) => Windows.Computed<double>(
            input.Width,
            input.Height,
            (y, row) =>
            {
                for (int x = 0; x < row.Length; x++)
                    row[x] = (flags[x, y] & Outsiders) == 0 ? ofValue(double.CreateTruncating(input[x, y]) + pedestal) : 0;
            },
            side / 2,
            context.Scratch,
            context.Bands);

        Windows<double> terms = Bordered(mean.Term), masses = Bordered(mean.Mass);
        context.Bands.ForEach(input.Height, (first, end) =>
        {
            Plane<double> sums = context.Scratch.Rent<double>(input.Width, 2);
            Span<double> departures = sums.Row(0), totals = sums.Row(1);
            for (int y = first; y < end; y++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                DoubleLanes.Run(new WindowMean(terms, masses, weights, side, y, departures, totals), input.Width, Lanes);
                for (int x = 0; x < departures.Length; x++)
                {
                    if ((flags[x, y] & Outsiders) != 0 || totals[x] == 0)
                    {
                        output[x, y] = input[x, y];
                        continue;
                    }

                    double value = double.CreateTruncating(input[x, y]);
                    output[x, y] = T.CreateTruncating(value + mean.Change(value + pedestal, departures[x] / totals[x]));
                }
            }
        });
    }

    private void RefuseOthers(Plane<T> input, Plane<SampleFlags> flags, int frame)
    {
        for (int y = 0; y < input.Height; y++)
        {
            for (int x = 0; x < input.Width; x++)
            {
                if ((flags[x, y] & Outsiders) != 0)
                    continue;
                double value = double.CreateTruncating(input[x, y]), u = value + pedestal;
                if (!(u > 0))
                {
                    throw new StackFormatException(
                        $"frame {frame}, pixel ({x}, {y})",
                        string.Create(CultureInfo.InvariantCulture, $"the value {value:R} is not above 0 with the pedestal {pedestal:R}, as {filter} needs"),
                        string.Create(CultureInfo.InvariantCulture, $"state a pedestal above {-value:R} for the step, or mask the pixel"));
                }

                if (!double.IsFinite(mean.Term(u)) || !double.IsNormal(mean.Mass(u)))
                {
                    throw new StackFormatException(
                        $"frame {frame}, pixel ({x}, {y})",
                        string.Create(CultureInfo.InvariantCulture, $"the value {value:R} is beyond what {filter} can compute"),
                        "lower the order, state another pedestal, or mask the pixel");
                }
            }
        }
    }
}
