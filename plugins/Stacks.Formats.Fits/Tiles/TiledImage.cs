using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>The ways to compress a tile (Standard 4.0, table 36).</summary>
internal enum TileAlgorithm
{
    /// <summary>Samples as they stand in an image.</summary>
    None,

    /// <summary>Rice coding of differences.</summary>
    Rice,

    /// <summary>gzip of the big-endian samples.</summary>
    Gzip1,

    /// <summary>gzip of the big-endian samples, all first bytes first.</summary>
    Gzip2,

    /// <summary>Run lengths of masks.</summary>
    Plio,

    /// <summary>The H-transform, quadtree coded.</summary>
    Hcompress,
}

/// <summary>How floating-point samples were made integers before they were compressed (Standard 4.0, section 10.2).</summary>
internal enum TileQuantisation
{
    /// <summary>They were not.</summary>
    None,

    /// <summary>value = ZZERO + ZSCALE * integer.</summary>
    NoDither,

    /// <summary>A random offset is taken from every sample.</summary>
    Dither1,

    /// <summary>The same, but that exact zeros stay zero.</summary>
    Dither2,
}

/// <summary>
/// An image in compressed tiles, as the header of its table describes it (Standard 4.0, section 10.1): no samples, and
/// nothing that grows with the number of tiles.
/// </summary>
internal sealed record TiledImage
{
    /// <summary>Longest row of a table of tiles; the standard's columns take 104 bytes.</summary>
    private const long MostRowBytes = 1 << 16;

    /// <summary>Samples of a tile that may be any without a byte behind them.</summary>
    private const long FreeBytes = 1 << 24;

    /// <summary>Deflate makes at most 1032 bytes of one (a run of 258 in two bits), Rice coding fewer.</summary>
    private const long MostGrowth = 1100;

    /// <summary>Bytes that come of one where an even plane is coded as a whole.</summary>
    private const long MostGrowthOfPlanes = 8192;

    private const int MostSettings = 99;
    private const string GetAgain = "get the file again";

    /// <summary>ZCMPTYPE.</summary>
    public required TileAlgorithm Algorithm { get; init; }

    /// <summary>ZQUANTIZ.</summary>
    public required TileQuantisation Quantisation { get; init; }

    /// <summary>ZDITHER0, 1 to 10000; 0 where samples are not dithered.</summary>
    public required int Seed { get; init; }

    /// <summary>The tiles.</summary>
    public required TileGrid Grid { get; init; }

    /// <summary>ZBITPIX.</summary>
    public required int BitPix { get; init; }

    /// <summary>BLOCKSIZE of Rice coding.</summary>
    public required int BlockSize { get; init; }

    /// <summary>BYTEPIX of Rice coding.</summary>
    public required int BytePix { get; init; }

    /// <summary>SMOOTH of HCOMPRESS: the image is smoothed when it is decoded.</summary>
    public required bool Smooth { get; init; }

    /// <summary>ZBLANK where one stands for all tiles; null when there is none.</summary>
    public required long? Blank { get; init; }

    /// <summary>ZSCALE where one stands for all tiles; null when there is none.</summary>
    public required double? Scale { get; init; }

    /// <summary>ZZERO where one stands for all tiles; null when there is none.</summary>
    public required double? Zero { get; init; }

    /// <summary>COMPRESSED_DATA; null when there is none.</summary>
    public required TileColumn? Compressed { get; init; }

    /// <summary>GZIP_COMPRESSED_DATA; null when there is none.</summary>
    public required TileColumn? Gzipped { get; init; }

    /// <summary>UNCOMPRESSED_DATA; null when there is none.</summary>
    public required TileColumn? Uncompressed { get; init; }

    /// <summary>The column ZSCALE; null when there is none.</summary>
    public required TileColumn? ScaleColumn { get; init; }

    /// <summary>The column ZZERO; null when there is none.</summary>
    public required TileColumn? ZeroColumn { get; init; }

    /// <summary>The column ZBLANK; null when there is none.</summary>
    public required TileColumn? BlankColumn { get; init; }

    /// <summary>Bytes of a row of the table.</summary>
    public required int RowBytes { get; init; }

    /// <summary>Bytes from the start of the data unit to the heap.</summary>
    public required long HeapOffset { get; init; }

    /// <summary>Bytes of the heap.</summary>
    public required long HeapBytes { get; init; }

    /// <summary>True when the compressed integers stand for floating-point samples.</summary>
    public bool IsQuantised => Quantisation != TileQuantisation.None && (ScaleColumn is not null || Scale is not null);

    /// <summary>Reads the description of an image of two and more axes, and checks it against the size of the table.</summary>
    /// <param name="hdu">The HDU, with the image's axes.</param>
    /// <param name="table">The header as it stands in the file.</param>
    /// <exception cref="StackFormatException">Broken, hostile, or of a kind that is refused by name.</exception>
    public static TiledImage Read(Hdu hdu, FitsHeader table)
    {
        if (table.OwnText("ZMASKCMP") is { } mask)
            throw new StackFormatException($"{table.Where}, keyword ZMASKCMP", $"the missing samples stand in a mask of their own ('{mask.Trim()}'), which is not read", "unpack the file with the program that made it");
        TileAlgorithm algorithm = AlgorithmOf(hdu.Compression, table);
        long rowBytes = table.RequiredInteger("NAXIS1", 1, MostRowBytes);
        long rows = table.RequiredInteger("NAXIS2", 0, long.MaxValue);
        TileGrid grid = ReadGrid(hdu, table, rows);
        IReadOnlyList<TileColumn> columns = TileColumn.Read(table, rowBytes);
        TileColumn? Column(string name, Func<TileColumn, bool> isRight) => columns.FirstOrDefault(c => c.Name == name) switch
        {
            { } column when !isRight(column) => throw new StackFormatException($"{table.Where}, column {name}", "its type is not one that the standard gives it", GetAgain),
            var column => column,
        };

        long heapOffset = table.OwnInteger("THEAP") ?? rowBytes * rows;
        if (heapOffset < rowBytes * rows || heapOffset > hdu.DataBytes)
            throw new StackFormatException($"{table.Where}, keyword THEAP", string.Create(CultureInfo.InvariantCulture, $"a heap at byte {heapOffset} lies in the table or behind the data unit of {hdu.DataBytes} bytes"), GetAgain);
        long growth = algorithm is TileAlgorithm.Plio or TileAlgorithm.Hcompress ? MostGrowthOfPlanes : MostGrowth;
        if ((Int128)hdu.PlaneBytes * hdu.PromisedPlanes > ((Int128)growth * hdu.DataBytes) + FreeBytes)
            throw new StackFormatException($"{table.Where}, keywords ZNAXISn", $"an image of {hdu.Shape} samples cannot be held by {hdu.DataBytes} bytes", GetAgain);

        bool isFloat = hdu.BitPix < 0;
        TileQuantisation quantisation = QuantisationOf(table, isFloat);
        bool isDithered = quantisation is TileQuantisation.Dither1 or TileQuantisation.Dither2;
        Dictionary<string, long> settings = ReadSettings(table);
        TiledImage image = new()
        {
            Algorithm = algorithm,
            Quantisation = quantisation,
            Seed = isDithered ? (int)table.RequiredInteger("ZDITHER0", 1, 10_000) : 0,
            Grid = grid,
            BitPix = hdu.BitPix,
            BlockSize = (int)Setting(settings, "BLOCKSIZE", 32, 1, 1 << 16, table),
            BytePix = (int)Setting(settings, "BYTEPIX", 4, 1, 4, table),
            Smooth = Setting(settings, "SMOOTH", 0, 0, 1, table) != 0,
            Blank = table.OwnInteger("ZBLANK"),
            Scale = table.OwnNumber("ZSCALE"),
            Zero = table.OwnNumber("ZZERO"),
            Compressed = Column("COMPRESSED_DATA", c => c.IsInHeap && c.HeapType is 'B' or 'I' or 'J'),
            Gzipped = Column("GZIP_COMPRESSED_DATA", c => c.IsInHeap && c.HeapType == 'B'),
            Uncompressed = Column("UNCOMPRESSED_DATA", c => c.IsInHeap && TileColumn.NumberBytes(c.HeapType) > 0),
            ScaleColumn = Column("ZSCALE", c => c.IsNumber),
            ZeroColumn = Column("ZZERO", c => c.IsNumber),
            BlankColumn = Column("ZBLANK", c => c.IsNumber && c.Type is not ('E' or 'D')),
            RowBytes = (int)rowBytes,
            HeapOffset = heapOffset,
            HeapBytes = hdu.DataBytes - heapOffset,
        };
        if (image.BytePix == 3)
            throw new StackFormatException($"{table.Where}, parameter BYTEPIX of the compression (ZVALi)", "samples of 3 bytes", GetAgain);
        if (image.Compressed is null && image.Gzipped is null && image.Uncompressed is null)
            throw new StackFormatException(table.Where, "no column holds the tiles (COMPRESSED_DATA, GZIP_COMPRESSED_DATA or UNCOMPRESSED_DATA)", GetAgain);
        if (!isFloat && (image.ScaleColumn ?? image.ZeroColumn) is { } scaling)
            throw new StackFormatException($"{table.Where}, column {scaling.Name}", "integer samples that were scaled before they were compressed are not read", "unpack the file with the program that made it");
        if (isFloat && algorithm is TileAlgorithm.Rice or TileAlgorithm.Plio or TileAlgorithm.Hcompress && !image.IsQuantised)
            throw new StackFormatException(table.Where, $"{hdu.Compression} compresses integers, and nothing says how they became floating-point samples (ZSCALE)", GetAgain);
        return image;
    }

    private static TileAlgorithm AlgorithmOf(string? name, FitsHeader table) => name switch
    {
        "RICE_1" or "RICE_ONE" => TileAlgorithm.Rice, // RICE_ONE is an old spelling.
        "GZIP_1" => TileAlgorithm.Gzip1,
        "GZIP_2" => TileAlgorithm.Gzip2,
        "PLIO_1" => TileAlgorithm.Plio,
        "HCOMPRESS_1" => TileAlgorithm.Hcompress,
        "NOCOMPRESS" => TileAlgorithm.None,
        _ => throw new StackFormatException($"{table.Where}, keyword ZCMPTYPE", $"the standard has no compression '{name}'", "unpack the file with the program that made it"),
    };

    private static TileQuantisation QuantisationOf(FitsHeader table, bool isFloat) => (isFloat, table.OwnText("ZQUANTIZ")?.Trim()) switch
    {
        (false, _) or (true, "NONE") => TileQuantisation.None,
        (true, null or "NO_DITHER") => TileQuantisation.NoDither,
        (true, "SUBTRACTIVE_DITHER_1") => TileQuantisation.Dither1,
        (true, "SUBTRACTIVE_DITHER_2") => TileQuantisation.Dither2,
        (_, var name) => throw new StackFormatException($"{table.Where}, keyword ZQUANTIZ", $"the standard has no quantisation '{name}'", "unpack the file with the program that made it"),
    };

    /// <summary>ZTILEn, by default a row; a row of the table for every tile.</summary>
    private static TileGrid ReadGrid(Hdu hdu, FitsHeader table, long rows)
    {
        long[] tile = new long[hdu.Axes.Count];
        for (int i = 0; i < tile.Length; i++)
        {
            string keyword = string.Create(CultureInfo.InvariantCulture, $"ZTILE{i + 1}");
            tile[i] = table.OwnInteger(keyword) ?? (i == 0 ? hdu.Axes[0] : 1);
            if (tile[i] < 1)
                throw new StackFormatException($"{table.Where}, keyword {keyword}", $"a tile of {tile[i]} samples", GetAgain);
        }

        TileGrid grid = new(hdu.Axes, tile);
        if (grid.TileSamples > TileGrid.MostTileSamples)
            throw new StackFormatException($"{table.Where}, keywords ZTILEn", $"a tile of {grid.TileSamples} samples does not fit memory", "unpack the file with the program that made it");
        if (grid.Tiles > rows)
            throw new StackFormatException($"{table.Where}, keyword NAXIS2", $"{rows} rows for {grid.Tiles} tiles", GetAgain);
        return grid;
    }

    /// <summary>The parameters of the compression: ZVALi by their names in ZNAMEi.</summary>
    private static Dictionary<string, long> ReadSettings(FitsHeader table)
    {
        Dictionary<string, long> settings = [];
        for (int i = 1; i <= MostSettings && table.OwnText(string.Create(CultureInfo.InvariantCulture, $"ZNAME{i}")) is { } name; i++)
        {
            if (table.OwnNumber(string.Create(CultureInfo.InvariantCulture, $"ZVAL{i}")) is { } value && Math.Abs(value) < int.MaxValue)
                settings.TryAdd(name.Trim().ToUpperInvariant(), (long)value);
        }

        return settings;
    }

    private static long Setting(Dictionary<string, long> settings, string name, long usual, long least, long most, FitsHeader table)
    {
        long value = settings.GetValueOrDefault(name, usual);
        return value >= least && value <= most
            ? value
            : throw new StackFormatException($"{table.Where}, parameter {name} of the compression (ZVALi)", $"{value} is outside {least} to {most}", GetAgain);
    }
}
