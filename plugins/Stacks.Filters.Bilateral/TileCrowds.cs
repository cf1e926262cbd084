using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// For each tile the first of sixteen range levels that hold most of its samples: from the lowest sample on when all fit,
/// else about the median of sixteen of them.
/// </summary>
internal sealed class TileCrowds(SpatialGrid grid, IScratch scratch)
{
    private const int Probes = 16;

    private readonly Plane<int> firsts = scratch.Rent<int>(grid.TilesX, grid.TilesY);
    private readonly Plane<int> lowest = scratch.Rent<int>(grid.TilesX, grid.TilesY);
    private readonly Plane<int> highest = scratch.Rent<int>(grid.TilesX, grid.TilesY);

    /// <summary>Bytes of all this.</summary>
    public static long Bytes(SpatialGrid grid) => 12L * grid.TilesX * grid.TilesY;

    /// <summary>The tile's first level, or -1 when none of its samples takes part.</summary>
    public int First(int tileX, int tileY) => firsts[tileX, tileY];

    /// <summary>The lowest and the highest first level of a tile's samples; (0, -1) when none takes part.</summary>
    public (int Lowest, int Highest) Levels(int tileX, int tileY) => (lowest[tileX, tileY], highest[tileX, tileY]);

    /// <summary>Finds the levels of every tile.</summary>
    public void Find(GuideLevels guide, int room, IRowBands bands) => bands.ForEach(grid.TilesY, (first, end) =>
    {
        for (int tileY = first; tileY < end; tileY++)
        {
            for (int tileX = 0; tileX < grid.TilesX; tileX++)
                FindIn(guide.Samples, tileX, tileY, room);
        }
    });

    /// <summary>Indices of the lowest and the highest guide sample in the first tiles that reach the frame's extreme levels; null when none takes part.</summary>
    public (int Lowest, int Highest)? Extremes(Plane<int> guide)
    {
        (int Tile, int Level) low = (-1, int.MaxValue), high = (-1, -1);
        for (int tile = 0; tile < highest.Length; tile++)
        {
            if (highest.Samples[tile] >= 0 && lowest.Samples[tile] < low.Level)
                low = (tile, lowest.Samples[tile]);
            if (highest.Samples[tile] > high.Level)
                high = (tile, highest.Samples[tile]);
        }

        return high.Tile < 0 ? null : (Extreme(guide, low.Tile, -1), Extreme(guide, high.Tile, 1));
    }

    private int Extreme(Plane<int> guide, int tile, int sign)
    {
        int left = tile % grid.TilesX * grid.Pitch, top = tile / grid.TilesX * grid.Pitch, best = -1;
        for (int y = top; y < Math.Min(top + grid.Pitch, grid.Height); y++)
        {
            for (int x = left; x < Math.Min(left + grid.Pitch, grid.Width); x++)
            {
                int i = (y * grid.Width) + x;
                if (guide.Samples[i] >= 0 && (best < 0 || sign * guide.Samples[i] > sign * guide.Samples[best]))
                    best = i;
            }
        }

        return best;
    }

    private void FindIn(Plane<int> samples, int tileX, int tileY, int room)
    {
        int left = tileX * grid.Pitch, top = tileY * grid.Pitch;
        int columns = Math.Min(grid.Pitch, grid.Width - left), rows = Math.Min(grid.Pitch, grid.Height - top);
        uint least = uint.MaxValue;
        int most = GuideLevels.Absent;
        for (int y = top; y < top + rows; y++)
        {
            foreach (int sample in samples.Row(y).Slice(left, columns))
            {
                least = Math.Min(least, (uint)sample);
                most = Math.Max(most, sample);
            }
        }

        int low = most < 0 ? 0 : (int)least >> LevelWeights.FractionBits, high = most >> LevelWeights.FractionBits;
        lowest[tileX, tileY] = low;
        highest[tileX, tileY] = high;
        firsts[tileX, tileY] = high < 0 ? -1 : high - low <= room ? low : Math.Max(low, MedianLevel(samples, left, top, columns, rows) - (room / 2));
    }

    private static int MedianLevel(Plane<int> samples, int left, int top, int columns, int rows)
    {
        Span<int> probes = stackalloc int[Probes];
        for (int i = 0; i < Probes; i++)
        {
            int place = (int)((long)columns * rows * i / Probes);
            probes[i] = samples[left + (place % columns), top + (place / columns)];
        }

        probes.Sort();
        return probes[Probes / 2] >> LevelWeights.FractionBits;
    }
}
