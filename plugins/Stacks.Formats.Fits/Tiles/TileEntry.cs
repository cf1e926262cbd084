namespace Stacks.Formats.Fits.Tiles;

/// <summary>Which column of the table holds a tile.</summary>
internal enum TileSource
{
    /// <summary>COMPRESSED_DATA.</summary>
    Compressed,

    /// <summary>GZIP_COMPRESSED_DATA: samples that were not quantised.</summary>
    Gzipped,

    /// <summary>UNCOMPRESSED_DATA.</summary>
    Uncompressed,
}

/// <summary>A row of the table of tiles.</summary>
/// <param name="Source">The column that holds the tile.</param>
/// <param name="Offset">Where its bytes start: in the heap, or in what was read of it.</param>
/// <param name="Length">Bytes.</param>
/// <param name="Scale">ZSCALE.</param>
/// <param name="Zero">ZZERO.</param>
/// <param name="Blank">ZBLANK.</param>
/// <param name="HasBlank">False where there is no ZBLANK.</param>
internal readonly record struct TileEntry(TileSource Source, long Offset, int Length, double Scale, double Zero, long Blank, bool HasBlank);
