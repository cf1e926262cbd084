using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>Makes the layout of a page from its directory, or refuses the page by name.</summary>
internal sealed class PageRules(TiffDirectory directory, FileWindow window)
{
    /// <summary>Bounds the memory of a page's table of segments (16 bytes each).</summary>
    private const int MostSegments = 1 << 21;

    /// <summary>Bytes up to which a tile may be any number of times larger than its page.</summary>
    private const long LargestPadded = 1 << 24;

    private const string SaveAgain = "save the stack uncompressed or with Deflate or LZW";

    /// <summary>The layout of the page.</summary>
    /// <exception cref="StackFormatException">A kind that is refused, or fields that contradict each other.</exception>
    public PageLayout Layout()
    {
        bool tiled = directory.Find(Tag.TileOffsets) is not null;
        TiffField? offsets = directory.Find(tiled ? Tag.TileOffsets : Tag.StripOffsets);
        TiffField? counts = directory.Find(tiled ? Tag.TileByteCounts : Tag.StripByteCounts);
        if ((offsets is { } o && !o.Type.IsWholeNumber()) || (counts is { } c && !c.Type.IsWholeNumber()))
            throw Broken(Tag.StripOffsets, "the places of the image data are not whole numbers");

        bool reduced = (Number(Tag.NewSubfileType, 0) & 1) != 0 || Number(Tag.SubfileType, 1) == 2;
        if (reduced)
            return Thumbnail(offsets, counts);
        return Science(offsets ?? throw Broken(Tag.StripOffsets, "the page has neither strips nor tiles"), counts, tiled);
    }

    private PageLayout Thumbnail(TiffField? offsets, TiffField? counts)
    {
        bool carried = Number(Tag.Compression, 1) != 6 && offsets is { Count: <= MostSegments } && counts is { } c && c.Count >= offsets.Value.Count;
        return new PageLayout
        {
            Carried = carried,
            Segments = carried ? (int)offsets!.Value.Count : 0,
            OffsetType = offsets?.Type ?? default,
            CountType = counts?.Type ?? default,
            Shape = string.Create(CultureInfo.InvariantCulture, $"{Number(Tag.ImageWidth, 0)} x {Number(Tag.ImageLength, 0)}"),
        };
    }

    private PageLayout Science(TiffField offsets, TiffField? counts, bool tiled)
    {
        RefuseOtherKinds();
        long samples = Number(Tag.SamplesPerPixel, 1);
        SampleType type = TypeOfSamples(samples);
        bool planar = samples > 1 && Number(Tag.PlanarConfiguration, 1) == 2;
        int width = Side(Tag.ImageWidth);
        int height = Side(Tag.ImageLength);
        if ((long)width * height > Array.MaxLength / type.Size())
            throw Refused(Tag.ImageWidth, string.Create(CultureInfo.InvariantCulture, $"a page of {width} x {height} samples of {type.Size()} bytes is larger than 2 GiB"), "cut the pages into smaller ones");

        int segmentWidth = tiled ? Side(Tag.TileWidth) : width;
        int segmentHeight = tiled ? Side(Tag.TileLength) : (int)Math.Min(Number(Tag.RowsPerStrip, uint.MaxValue), height);
        if (segmentHeight < 1)
            throw Broken(Tag.RowsPerStrip, "a strip has no rows");
        SegmentGrid grid = new(width, height, segmentWidth, segmentHeight, type.Size(), tiled, planar ? 1 : (int)samples, planar ? (int)samples : 1);
        if (grid.RowBytes > Array.MaxLength / segmentHeight)
            throw Refused(Tag.TileWidth, $"a {grid.Word} of {segmentWidth} x {segmentHeight} pixels is larger than 2 GiB", "save the stack with smaller ones");
        if (grid.RowBytes * segmentHeight > Math.Max(LargestPadded, 4L * width * height * grid.SampleSize * grid.Chunk))
            throw Broken(Tag.TileWidth, string.Create(CultureInfo.InvariantCulture, $"a tile of {segmentWidth} x {segmentHeight} pixels is far larger than the page of {width} x {height}"));
        if (grid.Count > MostSegments)
            throw Refused(offsets.Tag, $"the page is cut into more than {MostSegments} {grid.Word}s", "save the stack with larger ones");
        if (offsets.Count < grid.Count)
            throw Broken(offsets.Tag, string.Create(CultureInfo.InvariantCulture, $"the page needs {grid.Count} {grid.Word}s and lists {offsets.Count}"));

        Compression compression = KindOfCompression();
        if (counts is null && compression != Compression.None)
            throw Broken(Tag.StripByteCounts, "the page does not say how long its compressed image data are");
        if (counts is { } c && c.Count < grid.Count)
            throw Broken(c.Tag, string.Create(CultureInfo.InvariantCulture, $"the page needs {grid.Count} byte counts and lists {c.Count}"));

        return new PageLayout
        {
            Frame = new FrameLayout
            {
                Width = width,
                Height = height,
                SampleType = type,
                QuantisationStep = type.IsInteger() ? 1 : 0,
                SaturationStored = type.IsInteger() ? type.Maximum() : null,
                Lattice = Mosaic(width, height),
            },
            Samples = (int)samples,
            Grid = grid,
            Compression = compression,
            Predictor = KindOfPredictor(compression, type),
            Photometric = (int)Number(Tag.Photometric, 1),
            Segments = (int)grid.Count,
            OffsetType = offsets.Type,
            CountType = counts?.Type ?? default,
            Shape = samples == 1 ? $"{width} x {height} {type.Name()}" : $"{width} x {height} {type.Name()}, {samples} samples a pixel",
        };
    }

    private void RefuseOtherKinds()
    {
        long samples = Number(Tag.SamplesPerPixel, 1);
        if (samples is < 1 or > ushort.MaxValue)
            throw Broken(Tag.SamplesPerPixel, $"{samples} samples per pixel");
        if (samples > 1 && Number(Tag.PlanarConfiguration, 1) is not (1 or 2))
            throw Broken(Tag.PlanarConfiguration, "the samples of a pixel are neither side by side (1) nor in planes (2)");
        long photometric = Number(Tag.Photometric, 1);
        if (samples > 1 && photometric == 32803)
            throw Broken(Tag.SamplesPerPixel, $"{samples} samples per pixel in a colour-filter mosaic");
        if (photometric is not (0 or 1 or 2 or 32803 or 34892))
            throw Refused(Tag.Photometric, $"the page holds {PhotometricName(photometric)}, not linear light", "save the measured values as greyscale");
        if (Number(Tag.FillOrder, 1) != 1)
            throw Refused(Tag.FillOrder, "the bits of each byte are stored in reverse (FillOrder 2)", "save the stack with FillOrder 1");
    }

    private SampleType TypeOfSamples(long samples)
    {
        long bits = SameForAll(Tag.BitsPerSample, samples);
        long format = SameForAll(Tag.SampleFormat, samples);
        return (format, bits) switch
        {
            (1 or 4, 8) => SampleType.UInt8,
            (1 or 4, 16) => SampleType.UInt16,
            (1 or 4, 32) => SampleType.UInt32,
            (1 or 4, 64) => SampleType.UInt64,
            (2, 8) => SampleType.Int8,
            (2, 16) => SampleType.Int16,
            (2, 32) => SampleType.Int32,
            (2, 64) => SampleType.Int64,
            (3, 16) => SampleType.Float16,
            (3, 32) => SampleType.Float32,
            (3, 64) => SampleType.Float64,
            (5 or 6, _) => throw Refused(Tag.SampleFormat, "complex samples are not read", "save real and imaginary part as pages of their own"),
            (3, _) => throw Refused(Tag.BitsPerSample, $"{bits}-bit floating-point samples are not read", "save the stack with 16, 32 or 64 bits"),
            (1 or 2 or 4, _) => throw Refused(Tag.BitsPerSample, $"{bits}-bit integer samples are not read", "save the stack with 8, 16, 32 or 64 bits"),
            _ => throw Broken(Tag.SampleFormat, $"sample format {format} does not exist"),
        };
    }

    private Compression KindOfCompression() => Number(Tag.Compression, 1) switch
    {
        1 => Compression.None,
        5 => Compression.Lzw,
        8 => Compression.Deflate,
        32946 => Compression.OldDeflate,
        32773 => Compression.PackBits,
        50000 => Compression.Zstd,
        6 => throw Refused(Tag.Compression, "old-style JPEG compression is not read and its values are not exact", SaveAgain),
        7 => throw Refused(Tag.Compression, "JPEG compression is not read and its values are seldom exact", SaveAgain),
        2 or 3 or 4 => throw Refused(Tag.Compression, "CCITT fax compression (1-bit images) is not read", SaveAgain),
        long other => throw Refused(Tag.Compression, $"compression scheme {other} is not read", SaveAgain),
    };

    /// <summary>
    /// A predictor goes with LZW, Deflate and Zstandard only: elsewhere the field means nothing (TIFF 6.0, section 14; common
    /// practice for the two others).
    /// </summary>
    private int KindOfPredictor(Compression compression, SampleType type)
    {
        if (compression is Compression.None or Compression.PackBits)
            return 1;
        return Number(Tag.Predictor, 1) switch
        {
            1 => 1,
            2 => 2,
            3 when !type.IsInteger() => 3,
            3 => throw Broken(Tag.Predictor, "the floating-point predictor goes with floating-point samples only"),
            long other => throw Refused(Tag.Predictor, $"predictor {other} is not read", "save the stack with predictor 1, 2 or 3"),
        };
    }

    /// <summary>CFARepeatPatternDim is rows, columns (TIFF/EP); a mosaic page without it is taken for 2 x 2 (common practice).</summary>
    private Lattice Mosaic(int width, int height)
    {
        if (directory.Find(Tag.CfaRepeatPatternDim) is not { } field)
            return Number(Tag.Photometric, 1) == 32803 ? new Lattice(Math.Min(2, width), Math.Min(2, height)) : Lattice.Single;
        if (field.Type != FieldType.Short || field.Count != 2)
            throw Broken(Tag.CfaRepeatPatternDim, "the period of the colour-filter mosaic is not two short numbers");
        long rows = directory.Value(window, field, 0);
        long columns = directory.Value(window, field, 1);
        if (rows < 1 || columns < 1 || rows > height || columns > width)
            throw Broken(Tag.CfaRepeatPatternDim, $"a colour-filter mosaic of {columns} x {rows} does not fit the page");
        return new Lattice((int)columns, (int)rows);
    }

    private static string PhotometricName(long photometric) => photometric switch
    {
        3 => "palette indices",
        4 => "a transparency mask",
        5 => "ink amounts (CMYK)",
        6 => "YCbCr colour",
        8 or 9 or 10 => "CIE L*a*b* colour",
        _ => $"photometric interpretation {photometric}",
    };

    /// <summary>A field with a value for each sample of a pixel, which must be alike; 1 where it is absent.</summary>
    private long SameForAll(ushort tag, long samples)
    {
        long first = Number(tag, 1);
        if (directory.Find(tag) is not { Count: > 1 } field)
            return first;
        for (int i = 1; i < Math.Min(field.Count, samples); i++)
        {
            if (directory.Value(window, field, i) is long other && other != first)
                throw Refused(tag, $"the samples of a pixel differ: {first} and {other}", "save each sample as a page of its own");
        }

        return first;
    }

    private int Side(ushort tag)
    {
        long side = Number(tag, 0);
        return side is >= 1 and <= int.MaxValue ? (int)side : throw Broken(tag, $"a side of {side} samples");
    }

    private long Number(ushort tag, long missing) => directory.Number(window, tag, missing);

    private StackFormatException Refused(ushort tag, string what, string remedy) => new($"{directory.Where}, tag {tag}", what, remedy);

    private StackFormatException Broken(ushort tag, string what) => Refused(tag, what, "copy the file again from its source, or save it anew");
}
