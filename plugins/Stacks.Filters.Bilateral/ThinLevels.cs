using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// Range levels of few members, such as those of star cores, pair by pair: w_pq is the Gaussian in space, to 6 ss, times
/// the sum over these levels of both samples' weights. Together with the grid's levels every level counts once.
/// </summary>
internal sealed class ThinLevels<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const int Lanes = LevelWeights.Lanes;

    private readonly SpatialGrid grid;
    private readonly LevelWeights weights;
    private readonly Plane<int> starts;
    private readonly Plane<int> levels;
    private readonly Plane<int> columns;
    private readonly Plane<int> rows;
    private readonly Plane<double> values;
    private readonly Plane<float> parts;
    private readonly int count;

    /// <summary>Finds the members: samples with a weight on any level that has <see cref="LevelSlots.Thin"/> members or fewer.</summary>
    public ThinLevels(LevelFrame<T> frame, IScratch scratch)
    {
        (grid, weights) = (frame.Grid, frame.Weights);
        (GuideLevels guide, LevelSlots slots) = (frame.Guide, frame.Slots);
        starts = scratch.Rent<int>(GuideLevels.Axis + 1, 1);
        for (int level = 0; level < GuideLevels.Axis; level++)
        {
            starts.Samples[level] = count;
            if (guide.Counts.Samples[level] > 0 && slots.IsThin(level))
                count += guide.Counts.Samples[level];
        }

        starts.Samples[GuideLevels.Axis] = count;
        int capacity = grid.ThinCapacity;
        levels = scratch.Rent<int>(capacity, 1);
        columns = scratch.Rent<int>(capacity, 1);
        rows = scratch.Rent<int>(capacity, 1);
        values = scratch.Rent<double>(capacity, 1);
        parts = scratch.Rent<float>(Lanes, capacity);
        Plane<int> next = scratch.Rent<int>(GuideLevels.Axis + 1, 1);
        starts.Samples.CopyTo(next.Samples);
        for (int tileY = 0; tileY < grid.TilesY; tileY++)
        {
            for (int tileX = 0; tileX < grid.TilesX; tileX++)
            {
                (int lowest, int highest) = frame.Crowds.Levels(tileX, tileY);
                if (starts.Samples[highest + 1] > starts.Samples[lowest])
                    Find(tileX * grid.Pitch, tileY * grid.Pitch, guide.Samples, slots, frame.Values, next.Samples);
            }
        }
    }

    /// <summary>Bytes of all this.</summary>
    public static long Bytes(SpatialGrid grid) => (GuideLevels.Axis * 8L) + (grid.ThinCapacity * (20L + (Lanes * sizeof(float))));

    /// <summary>Sets <paramref name="sums"/> and <paramref name="exchanges"/> to what thin levels add to them; 0 away from members.</summary>
    public void Sum<TForm>(Plane<float> factors, Plane<float> sums, Plane<float> exchanges, FrameContext context)
        where TForm : struct, IPassForm
    {
        context.Bands.ForEach(grid.Height, (first, end) =>
        {
            sums.Samples[(first * grid.Width)..(end * grid.Width)].Clear();
            if (TForm.Values)
                exchanges.Samples[(first * grid.Width)..(end * grid.Width)].Clear();
        });
        if (count == 0)
            return;
        context.Bands.ForEach(count, (first, end) =>
        {
            for (int p = first; p < end; p++)
                SumAt<TForm>(p, factors, sums, exchanges);
        });
    }

    private void Find(int left, int top, Plane<int> guide, LevelSlots slots, Plane<T> input, Span<int> next)
    {
        for (int y = top; y < Math.Min(top + grid.Pitch, grid.Height); y++)
        {
            for (int x = left; x < Math.Min(left + grid.Pitch, grid.Width); x++)
            {
                int level = guide[x, y] >> LevelWeights.FractionBits;
                if (level < 0 || starts.Samples[level] == starts.Samples[level + 1])
                    continue;
                int member = next[level]++;
                levels.Samples[member] = level;
                columns.Samples[member] = x;
                rows.Samples[member] = y;
                values.Samples[member] = double.CreateTruncating(input[x, y]);
                Span<float> part = parts.Row(member);
                weights.Of<LevelLanes512>(guide[x, y]).Store(ref part[0], 0);
                for (int j = 0; j < weights.Count; j++)
                {
                    if (slots.Members.Samples[level + j] > slots.Thin)
                        part[j] = 0;
                }
            }
        }
    }

    [SkipLocalsInit]
    private void SumAt<TForm>(int p, Plane<float> factors, Plane<float> sums, Plane<float> exchanges)
        where TForm : struct, IPassForm
    {
        Span<float> own = stackalloc float[3 * Lanes];
        own.Clear();
        parts.Row(p).CopyTo(own[Lanes..]);
        int x = columns.Samples[p], y = rows.Samples[p], level = levels.Samples[p];
        int reach = grid.Near.Length - 1;
        double value = values.Samples[p], sum = 0, exchange = 0;
        for (int other = level - weights.Count + 1; other < level + weights.Count; other++)
        {
            // Members of a level stand tile row by tile row.
            int end = starts.Samples[other + 1], lastTileRow = (y + reach) / grid.Pitch;
            for (int q = FirstFrom((y - reach) / grid.Pitch, starts.Samples[other], end); q < end && rows.Samples[q] / grid.Pitch <= lastTileRow; q++)
            {
                int right = Math.Abs(columns.Samples[q] - x), down = Math.Abs(rows.Samples[q] - y);
                if (right > reach || down > reach)
                    continue;
                LevelLanes512 common = LevelLanes512.Load(ref own[0], Lanes + other - level) * LevelLanes512.Load(ref parts.Row(q)[0], 0);
                double weight = grid.Near[right] * grid.Near[down] * common.Sum() * weights.Norm;
                if (TForm.Factors)
                    weight *= factors[columns.Samples[q], rows.Samples[q]];
                sum += weight;
                if (TForm.Values)
                    exchange += weight * (values.Samples[q] - value);
            }
        }

        sums[x, y] = (float)sum;
        if (TForm.Values)
            exchanges[x, y] = (float)exchange;
    }

    /// <summary>The first of the members [start, end) of a level that stands in a tile row or below it.</summary>
    private int FirstFrom(int tileRow, int start, int end)
    {
        while (start < end)
        {
            int middle = (start + end) / 2;
            (start, end) = rows.Samples[middle] / grid.Pitch < tileRow ? (middle + 1, end) : (start, middle);
        }

        return start;
    }
}
