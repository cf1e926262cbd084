using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The fast form's error, a posteriori: its result beside the double sum over all q to 5 ss at a sample each of the lowest
/// and the highest level of T, at some drawn by the frame's number, and at those of many drawn that changed most, which
/// lie at edges. The largest difference, in range sigmas.
/// </summary>
internal static class ErrorEstimate
{
    private const int Drawn = 3;
    private const int Changed = 5;
    private const int Draws = 2000;
    private const int Most = 2 + Drawn + Changed;
    private const double Reach = 5;

    /// <summary>The largest difference at the samples; 0 when none takes part.</summary>
    /// <param name="frame">The frame.</param>
    /// <param name="factors">c of the exchange form; null in the plain form.</param>
    /// <param name="result">What the fast form made of it.</param>
    /// <param name="range">s in noise sigmas.</param>
    /// <param name="context">Noise model, bands and scratch.</param>
    public static double Of<T>(LevelFrame<T> frame, Plane<float>? factors, Plane<T> result, double range, FrameContext context)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        Plane<int> places = context.Scratch.Rent<int>(2, Most);
        Plane<double> errors = context.Scratch.Rent<double>(1, Most);
        int count = Choose(frame, result, places, context);
        context.Bands.ForEach(Math.Max(1, count), (first, end) =>
        {
            Plane<double> rows = context.Scratch.Rent<double>(RealLanes.Padded(frame.Grid.Width), 6);
            for (int i = first; i < Math.Min(count, end); i++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                int x = places[0, i], y = places[1, i];
                double value = double.CreateTruncating(frame.Values[x, y]);
                (double weights, double exchange) = Sums(frame, factors, x, y, rows);
                double change = factors is { } c ? c[x, y] * exchange : exchange / weights;
                double off = double.CreateTruncating(result[x, y]) - (value + change);
                errors[0, i] = Math.Abs(off) / (range * context.Noise!.Sigma(x, y, value));
            }
        });

        double most = 0;
        for (int i = 0; i < count; i++)
            most = Math.Max(most, errors[0, i]);
        return most;
    }

    private static int Choose<T>(LevelFrame<T> frame, Plane<T> result, Plane<int> places, FrameContext context)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        Plane<int> guide = frame.Guide.Samples;
        if (frame.Crowds.Extremes(guide) is not (var lowest, var highest))
            return 0;
        Span<int> changed = stackalloc int[Changed];
        Span<double> changes = stackalloc double[Changed];
        changes.Clear();
        int count = 0;
        Add(lowest);
        Add(highest);
        Random random = new(context.FrameIndex);
        for (int draw = 0; draw < Draws; draw++)
        {
            int i = random.Next(guide.Length);
            if (guide.Samples[i] < 0)
                continue;
            if (count < 2 + Drawn)
            {
                Add(i);
                continue;
            }

            // The largest changes so far, in rising order.
            double value = double.CreateTruncating(frame.Values.Samples[i]);
            double change = Math.Abs(double.CreateTruncating(result.Samples[i]) - value) / context.Noise!.Sigma(i % guide.Width, i / guide.Width, value);
            for (int rank = 0; rank < Changed && change > changes[rank]; rank++)
            {
                if (rank > 0)
                    (changed[rank - 1], changes[rank - 1]) = (changed[rank], changes[rank]);
                (changed[rank], changes[rank]) = (i, change);
            }
        }

        for (int rank = 0; rank < Changed; rank++)
        {
            if (changes[rank] > 0)
                Add(changed[rank]);
        }

        return count;

        void Add(int i) => (places[0, count], places[1, count++]) = (i % guide.Width, i / guide.Width);
    }

    /// <summary>sum_q w_pq c_q and sum_q w_pq c_q (v_q - v_p), added up column by column, then over the columns.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private static (double Weights, double Exchange) Sums<T>(LevelFrame<T> frame, Plane<float>? factors, int px, int py, Plane<double> rows)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        SpatialGrid grid = frame.Grid;
        int reach = (int)(Reach * grid.Sigma);
        int left = Math.Max(0, px - reach), width = Math.Min(grid.Width - 1, px + reach) + 1 - left;
        double perSquare = Math.Log2(Math.E) / (2 * grid.Sigma * grid.Sigma);
        double perLevel = frame.Weights.Spacing * Math.Sqrt(Math.Log2(Math.E) / 2) / (1 << LevelWeights.FractionBits);
        double own = double.CreateTruncating(frame.Values[px, py]);
        int ownGuide = frame.Guide.Samples[px, py];
        Span<double> weights = rows.Row(0), exchanges = rows.Row(1), places = rows.Row(2);
        rows.Samples.Clear();
        for (int x = 0; x < width; x++)
            places[x] = -(double)(left + x - px) * (left + x - px) * perSquare;

        for (int y = Math.Max(0, py - reach); y <= Math.Min(grid.Height - 1, py + reach); y++)
        {
            ReadOnlySpan<int> guide = frame.Guide.Samples.Row(y).Slice(left, width);
            ReadOnlySpan<T> values = frame.Values.Row(y).Slice(left, width);
            Span<double> apart = rows.Row(3), differences = rows.Row(4), c = rows.Row(5);
            for (int x = 0; x < width; x++)
            {
                bool takesPart = guide[x] >= 0;
                apart[x] = (guide[x] - ownGuide) * perLevel;
                differences[x] = takesPart ? double.CreateTruncating(values[x]) - own : 0;
                c[x] = !takesPart ? 0 : factors is { } known ? known[left + x, y] : 1;
            }

            RealLanes.Run<ColumnSums, double>(new(rows, -(double)(y - py) * (y - py) * perSquare, width), RealLanes.Widest);
        }

        double weight = 0, exchange = 0;
        for (int x = 0; x < width; x++)
        {
            weight += weights[x];
            exchange += exchanges[x];
        }

        return (weight, exchange);
    }

    /// <summary>Adds w c and w c (v_q - v_p) of a row of q to each column's sums.</summary>
    private readonly ref struct ColumnSums(Plane<double> rows, double place, int width) : IRealKernel<double>
    {
        private readonly ref double weights = ref rows.Row(0)[0];
        private readonly ref double exchanges = ref rows.Row(1)[0];
        private readonly ref double places = ref rows.Row(2)[0];
        private readonly ref double apart = ref rows.Row(3)[0];
        private readonly ref double differences = ref rows.Row(4)[0];
        private readonly ref double factors = ref rows.Row(5)[0];
        private readonly double place = place;
        private readonly int width = width;

        /// <inheritdoc/>
        public void Compute<TLanes>()
            where TLanes : struct, IRealLanes<TLanes, double>
        {
            PowerOfTwo<TLanes, double> power = new();
            for (int x = 0; x < width; x += TLanes.Count)
            {
                TLanes inRange = TLanes.Load(ref apart, x);
                TLanes exponent = TLanes.MultiplySubtract(inRange, inRange, TLanes.Load(ref places, x) + TLanes.All(place));
                TLanes w = power.Of(exponent) * TLanes.Load(ref factors, x);
                (TLanes.Load(ref weights, x) + w).Store(ref weights, x);
                (TLanes.Load(ref exchanges, x) + (w * TLanes.Load(ref differences, x))).Store(ref exchanges, x);
            }
        }
    }
}
