using Stacks.Formats.Fits.Tiles;
using Xunit;

namespace Stacks.Tests.FitsTiles;

/// <summary>
/// The cut into tiles against a walk over every sample: Standard 4.0, section 10.1.1, counts tiles with the first axis
/// fastest, and a tile is an image of its own, row-major, shorter at the upper end of an axis.
/// </summary>
public class TileGridTests
{
    public static TheoryData<long[], long[]> Shapes => new()
    {
        { [7, 5], [7, 1] },
        { [7, 5], [3, 2] },
        { [7, 5], [100, 100] },
        { [1, 1], [1, 1] },
        { [6, 4, 5], [6, 1, 1] },
        { [6, 4, 5], [4, 3, 2] },
        { [5, 3, 4, 3], [2, 2, 3, 2] },
        { [5, 3, 1, 3, 2], [5, 3, 1, 2, 2] },
        { [4, 3, 2, 3, 5], [3, 2, 1, 2, 2] },
    };

    [Theory]
    [MemberData(nameof(Shapes))]
    public void Every_sample_is_found_where_the_standard_puts_it(long[] axes, long[] tileAxes)
    {
        long total = axes.Aggregate(1L, (product, axis) => product * axis);

        // By walking: which samples each tile holds, in the order of the image, which is the tile's own order.
        Dictionary<long, List<long>> held = [];
        for (long sample = 0; sample < total; sample++)
        {
            long rest = sample, tile = 0, step = 1;
            for (int i = 0; i < axes.Length; i++)
            {
                long place = rest % axes[i];
                rest /= axes[i];
                tile += place / Math.Min(tileAxes[i], axes[i]) * step;
                step *= (axes[i] + Math.Min(tileAxes[i], axes[i]) - 1) / Math.Min(tileAxes[i], axes[i]);
            }

            if (!held.TryGetValue(tile, out List<long>? samples))
                held[tile] = samples = [];
            samples.Add(sample);
        }

        TileGrid grid = new(axes, tileAxes);
        Assert.Equal(held.Count, grid.Tiles);
        long plane = axes[0] * axes[1];
        bool[] seen = new bool[total];
        for (long p = 0; p < total / plane; p++)
        {
            for (long n = 0; n < grid.TilesOfPlane; n++)
            {
                TilePart part = grid.PartOf(p, n);
                List<long> samples = held[grid.FirstTileOf(p) + n];
                Assert.Equal(samples.Count, part.TileSamples);
                for (int y = 0; y < part.Height; y++)
                {
                    for (int x = 0; x < part.Width; x++)
                    {
                        long sample = (p * plane) + ((part.Y + y) * axes[0]) + part.X + x;
                        Assert.Equal(sample, samples[part.FirstSample + (y * part.Width) + x]);
                        seen[sample] = true;
                    }
                }
            }
        }

        Assert.All(seen, Assert.True);
    }
}
