namespace Stacks.Formats.Fits.Tiles;

/// <summary>The part of a tile that lies in one plane.</summary>
/// <param name="X">First column in the plane.</param>
/// <param name="Y">First row in the plane.</param>
/// <param name="Width">Columns.</param>
/// <param name="Height">Rows.</param>
/// <param name="TileSamples">Samples of the whole tile, which may span planes.</param>
/// <param name="FirstSample">Sample of the tile with which this part begins.</param>
internal readonly record struct TilePart(int X, int Y, int Width, int Height, int TileSamples, int FirstSample)
{
    /// <summary>Samples of the part.</summary>
    public int Samples => Width * Height;

    /// <summary>True when the tile lies in one plane.</summary>
    public bool IsWhole => Samples == TileSamples;
}

/// <summary>
/// How an image is cut into tiles: tile i along an axis covers the samples from i * ZTILEn on, the last one as many as are
/// left; tiles are counted with the first axis fastest (Standard 4.0, section 10.1.1).
/// </summary>
internal sealed class TileGrid
{
    /// <summary>Samples of a tile: as many as an array of 64-bit integers can hold in 2 GiB.</summary>
    public const long MostTileSamples = int.MaxValue / 8;

    private readonly long[] axes;
    private readonly long[] tile;
    private readonly long[] counts;

    /// <summary>A grid over an image of two and more axes. The samples of the image fit 64 bits.</summary>
    /// <param name="axes">Samples along each axis, 1 or more.</param>
    /// <param name="tileAxes">Samples of a tile along each axis, 1 or more.</param>
    public TileGrid(IReadOnlyList<long> axes, IReadOnlyList<long> tileAxes)
    {
        this.axes = [.. axes];
        tile = [.. axes.Select((axis, i) => Math.Min(axis, tileAxes[i]))];
        counts = [.. this.axes.Select((axis, i) => ((axis - 1) / tile[i]) + 1)];
        TileSamples = tile.Aggregate(1L, (product, axis) => product * axis);
        Tiles = counts.Aggregate(1L, (product, count) => product * count);
        TilesOfPlane = counts[0] * counts[1];
    }

    /// <summary>Samples of a full tile.</summary>
    public long TileSamples { get; }

    /// <summary>Tiles of the image.</summary>
    public long Tiles { get; }

    /// <summary>Tiles that a plane lies in; they follow one another.</summary>
    public long TilesOfPlane { get; }

    /// <summary>The first of the tiles that a plane lies in.</summary>
    public long FirstTileOf(long plane)
    {
        long first = 0, step = TilesOfPlane;
        for (int i = 2; i < axes.Length; i++)
        {
            first += plane % axes[i] / tile[i] * step;
            plane /= axes[i];
            step *= counts[i];
        }

        return first;
    }

    /// <summary>What of the n-th tile of a plane lies in the plane.</summary>
    public TilePart PartOf(long plane, long n)
    {
        long x = n % counts[0] * tile[0], y = n / counts[0] * tile[1];
        long width = Math.Min(tile[0], axes[0] - x), height = Math.Min(tile[1], axes[1] - y);
        long skipped = 0, samples = width * height;
        for (int i = 2; i < axes.Length; i++)
        {
            long at = plane % axes[i];
            plane /= axes[i];
            skipped += at % tile[i] * samples;
            samples *= Math.Min(tile[i], axes[i] - (at / tile[i] * tile[i]));
        }

        return new TilePart((int)x, (int)y, (int)width, (int)height, (int)samples, (int)skipped);
    }
}
