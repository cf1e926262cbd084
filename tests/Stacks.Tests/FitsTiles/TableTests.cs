using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Tests.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.FitsTiles;

/// <summary>Tables built by hand: where tiles stand, what they stand for, and which are refused by name.</summary>
public class TableTests
{
    private static readonly FitsFormat Format = new();

    private static T[] Frame<T>(IStackReader reader, int frame)
        where T : unmanaged => MemoryMarshal.Cast<byte, T>(PassThrough.Stored(reader, frame)).ToArray();

    [Theory]
    [InlineData('P', 0)]
    [InlineData('Q', 0)]
    [InlineData('P', 37)]
    [InlineData('Q', 2880)]
    public void A_tile_stands_in_any_of_three_columns(char descriptor, int gap)
    {
        using TemporaryFolder folder = new();

        // 3 x 2 in tiles of a row; the first is compressed, the second is not; in a second plane the first is gzipped.
        using IStackReader reader = new TiledBytes { Gap = gap }
            .Column("ZSCALE", "1D", [.. Enumerable.Repeat(TiledBytes.Doubles(1), 4)])
            .Column("UNCOMPRESSED_DATA", $"1{descriptor}E(3)", null, FitsBytes.Floats(4, 5, 6), null, null)
            .Column("COMPRESSED_DATA", $"1{descriptor}B", TiledBytes.Gzip(TiledBytes.Ints(1, 2, 3)), null, null, TiledBytes.Gzip(TiledBytes.Ints(-1, -2, -3)))
            .Column("GZIP_COMPRESSED_DATA", $"1{descriptor}B", null, null, TiledBytes.Gzip(FitsBytes.Floats(7.5f, float.NaN, float.NegativeInfinity)), null)
            .File(-32, [3, 2, 2], [3, 1, 1], "GZIP_1", FitsBytes.Text("ZQUANTIZ", "NO_DITHER"))
            .Open(folder);
        Assert.Equal(2, reader.FrameCount);
        Assert.Equal([1, 2, 3, 4, 5, 6], Frame<float>(reader, 0));
        Assert.Equal([7.5f, float.NaN, float.NegativeInfinity, -1, -2, -3], Frame<float>(reader, 1));
    }

    [Fact]
    public void A_tile_over_several_planes_is_read_for_each_of_them()
    {
        using TemporaryFolder folder = new();

        // 3 x 2 x 3 in tiles of 2 x 2 x 2; samples count through the image from 0.
        static byte[] Tile(params int[] samples) => FitsBytes.Shorts(samples);
        using IStackReader reader = new TiledBytes()
            .Column("COMPRESSED_DATA", "1PB", Tile(0, 1, 3, 4, 6, 7, 9, 10), Tile(2, 5, 8, 11), Tile(12, 13, 15, 16), Tile(14, 17))
            .File(16, [3, 2, 3], [2, 2, 2], "NOCOMPRESS", FitsBytes.Card("BZERO", 32768))
            .Open(folder);
        Assert.Equal(SampleType.UInt16, reader.Layout(0).SampleType);
        for (int frame = 0; frame < 3; frame++)
            Assert.Equal(Enumerable.Range(6 * frame, 6).Select(sample => (ushort)(sample + 32768)), Frame<ushort>(reader, frame));
    }

    [Theory]
    [InlineData(true)]
    [InlineData(false)]
    public void Scale_zero_and_missing_value_stand_in_keywords_or_columns(bool inColumns)
    {
        using TemporaryFolder folder = new();
        byte[][] tiles = [TiledBytes.Gzip(TiledBytes.Ints(1, 2, -7)), TiledBytes.Gzip(TiledBytes.Ints(3, -8, -7))];
        TiledBytes table = new TiledBytes().Column("COMPRESSED_DATA", "1PB", tiles);
        string[] keywords = [FitsBytes.Card("ZSCALE", 0.5), FitsBytes.Card("ZZERO", 100.0), FitsBytes.Card("ZBLANK", -7)];
        if (inColumns)
        {
            table.Column("ZSCALE", "1D", TiledBytes.Doubles(0.5), TiledBytes.Doubles(2));
            table.Column("ZZERO", "1D", TiledBytes.Doubles(100), TiledBytes.Doubles(-1));
            table.Column("ZBLANK", "1J", TiledBytes.Ints(-7), TiledBytes.Ints(-8));
        }

        using IStackReader reader = table.File(-64, [3, 2], [3, 1], "GZIP_1", inColumns ? [] : keywords).Open(folder);
        double[] expected = inColumns ? [100.5, 101, double.NaN, 5, double.NaN, -15] : [100.5, 101, double.NaN, 101.5, 96, double.NaN];
        Assert.Equal(expected, Frame<double>(reader, 0));
    }

    [Fact]
    public void Integers_keep_blank_and_scaling_of_their_own()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = new TiledBytes()
            .Column("COMPRESSED_DATA", "1PB", TiledBytes.Gzip(TiledBytes.Ints(1, -32768, 32767)), TiledBytes.Gzip(FitsBytes.Shorts(1, -32768, 32767)))
            .File(16, [3, 2], [3, 1], "GZIP_1", FitsBytes.Card("ZBLANK", -32768), FitsBytes.Card("BSCALE", 2.0), FitsBytes.Card("BZERO", 5.0), FitsBytes.Text("BUNIT", "count"))
            .Open(folder);
        Assert.Equal(-32768, reader.Layout(0).Blank);
        Assert.Equal(new ValueTransform(2, 5), reader.Layout(0).Transform);
        Assert.Equal("count", reader.Layout(0).Unit);
        Assert.Equal([1, -32768, 32767, 1, -32768, 32767], Frame<short>(reader, 0));
    }

    [Fact]
    public void An_old_spelling_is_read_and_an_unfinished_name_is_dropped()
    {
        using TemporaryFolder folder = new();

        // Rice, by hand: first sample 7 in 4 bytes, then one block whose differences are all 0 (0 in 5 bits).
        using IStackReader reader = new TiledBytes()
            .Column("COMPRESSED_DATA", "1PB", [0, 0, 0, 7, 0], [0xFF, 0xFF, 0xFF, 0xFE, 0])
            .File(16, [3, 2], [3, 1], "RICE_ONE", FitsBytes.Text("EXTNAME", "COMPRESSED_IMAGE"))
            .Open(folder);
        Assert.Equal([7, 7, 7, -2, -2, -2], Frame<short>(reader, 0));
        Assert.Equal("HDU 1", reader.Layout(0).Extension);
        Assert.Equal("3 x 2 int16 in compressed tiles (RICE_ONE)", reader.Parts[1].Shape);
    }

    [Fact]
    public void A_compressed_mask_flags_and_a_compressed_error_plane_is_carried_as_it_stands()
    {
        using TemporaryFolder folder = new();
        byte[] samples = FitsBytes.Shorts(1, 2, 3, 4, 5, 6);
        (string[] Cards, byte[] Data) Plane(string name, int bitPix, params byte[][] tiles) =>
            new TiledBytes().Column("COMPRESSED_DATA", "1PB", tiles).Hdu(bitPix, [3, 2], [3, 1], "GZIP_1", FitsBytes.Text("EXTNAME", name), FitsBytes.Card("EXTVER", 1));
        (string[] Cards, byte[] Data) science = Plane("SCI", 16, TiledBytes.Gzip(samples[..6]), TiledBytes.Gzip(samples[6..]));
        (string[] Cards, byte[] Data) mask = Plane("DQ", 8, TiledBytes.Gzip([0, 1, 0]), TiledBytes.Gzip([0, 0, 255]));

        // ZMASKCMP is refused in an image that is read, and nobody reads this one.
        (string[] Cards, byte[] Data) error = Plane("ERR", 16, [1, 2, 3], [4, 5, 6]);
        error.Cards = [.. error.Cards, FitsBytes.Text("ZMASKCMP", "RICE_1")];
        byte[] file = new FitsBytes().Primary(8, [], []).Hdu(science.Cards, science.Data).Hdu(error.Cards, error.Data).Hdu(mask.Cards, mask.Data).ToArray();
        File.WriteAllBytes(folder.File("in.fits"), file);
        using IStackReader reader = Format.Open(folder.File("in.fits"), new ReadOptions());
        Assert.Equal(1, reader.FrameCount);
        Assert.Equal([1, 2, 3, 4, 5, 6], Frame<short>(reader, 0));
        Plane<SampleFlags> flags = new(new SampleFlags[6], 3, 2);
        Assert.True(reader.MarkQuality(0, flags));
        Assert.Equal([0, SampleFlags.Missing, 0, 0, 0, SampleFlags.Missing], flags.Samples.ToArray());

        PassThrough.Run(reader, Format, folder.File("out.fits"), compress: true);
        List<(List<string> Cards, byte[] Data)> before = FitsBytes.Split(file), after = FitsBytes.Split(File.ReadAllBytes(folder.File("out.fits")));
        for (int hdu = 2; hdu <= 3; hdu++)
        {
            Assert.Equal(before[hdu].Cards, after[hdu].Cards);
            Assert.Equal(before[hdu].Data, after[hdu].Data);
        }
    }

    [Fact]
    public void A_primary_that_says_something_of_its_own_stays_before_the_image()
    {
        using TemporaryFolder folder = new();
        (string[] cards, byte[] data) = new TiledBytes().Column("COMPRESSED_DATA", "1PB", TiledBytes.Gzip([1, 2, 3]), TiledBytes.Gzip([4, 5, 6]))
            .Hdu(8, [3, 2], [3, 1], "GZIP_1", FitsBytes.Card("ZSIMPLE", "T"), FitsBytes.Card("ZEXTEND", "T"), FitsBytes.Text("OBJECT", "M13"));
        foreach (bool isBare in (bool[])[true, false])
        {
            string name = $"in-{isBare}.fits", result = folder.File($"out-{isBare}.fits");
            using IStackReader reader = new FitsBytes().Primary(8, [], [], isBare ? [] : [FitsBytes.Text("ORIGIN", "here")]).Hdu(cards, data).Open(folder, name: name);
            Assert.Equal([1, 2, 3, 4, 5, 6], Frame<byte>(reader, 0));
            PassThrough.Run(reader, Format, result);
            List<(List<string> Cards, byte[] Data)> hdus = FitsBytes.Split(File.ReadAllBytes(result));
            (List<string> Cards, byte[] Data) image = hdus[isBare ? 0 : 1];
            Assert.Equal([1, 2, 3, 4, 5, 6], image.Data);
            Assert.StartsWith(isBare ? "SIMPLE  =" : "XTENSION= 'IMAGE   '", image.Cards[0], StringComparison.Ordinal);
            Assert.Contains(image.Cards, card => card.StartsWith("OBJECT  = 'M13", StringComparison.Ordinal));
            Assert.Equal(isBare, image.Cards.Any(card => card.StartsWith("EXTEND", StringComparison.Ordinal)));
            if (!isBare)
                Assert.Contains(hdus[0].Cards, card => card.StartsWith("ORIGIN  = 'here", StringComparison.Ordinal));
        }
    }

    public static TheoryData<string, string> Refusals => new()
    {
        { "ZMASKCMP", "ZMASKCMP= 'RICE_1'" },
        { "ZCMPTYPE", "-ZCMPTYPE|ZCMPTYPE= 'BZIP2_1'" },
        { "ZCMPTYPE", "-ZCMPTYPE" },
        { "ZQUANTIZ", "-ZBITPIX|ZBITPIX = -32|ZQUANTIZ= 'BY_DICE'" },
        { "ZDITHER0", "-ZBITPIX|ZBITPIX = -32|ZQUANTIZ= 'SUBTRACTIVE_DITHER_1'" },
        { "ZDITHER0", "-ZBITPIX|ZBITPIX = -32|ZQUANTIZ= 'SUBTRACTIVE_DITHER_1'|ZDITHER0= 10001" },
        { "ZSCALE", "-ZBITPIX|ZBITPIX = -32|-ZCMPTYPE|ZCMPTYPE= 'RICE_1'" },
        { "BLOCKSIZE", "ZNAME1  = 'BLOCKSIZE'|ZVAL1   = 0" },
        { "BYTEPIX", "ZNAME1  = 'BYTEPIX'|ZVAL1   = 8" },
        { "BYTEPIX", "ZNAME1  = 'BYTEPIX'|ZVAL1   = 3" },
        { "ZBITPIX", "-ZBITPIX" },
        { "ZBITPIX", "-ZBITPIX|ZBITPIX = 24" },
        { "ZNAXIS", "-ZNAXIS" },
        { "ZNAXIS2", "-ZNAXIS2" },
        { "ZNAXISn", "-ZNAXIS1|ZNAXIS1 = 9223372036854775807" },
        { "2 GiB", "-ZNAXIS1|ZNAXIS1 = 5000000000" },
        { "cannot be held", "-ZNAXIS1|ZNAXIS1 = 10000000|-ZTILE1|ZTILE1  = 10000000" },
        { "does not fit memory", "-ZNAXIS1|ZNAXIS1 = 300000000|-ZTILE1|ZTILE1  = 300000000" },
        { "2 rows for 3000", "-ZNAXIS2|ZNAXIS2 = 3000" },
        { "2 rows for 4", "-ZTILE1|ZTILE1  = 2" },
        { "ZTILE1", "-ZTILE1|ZTILE1  = 0" },
        { "ZTILE2", "-ZTILE2|ZTILE2  = -1" },
        { "TFORM1", "-TFORM1|TFORM1  = '1PB(5'|-TFIELDS|TFIELDS = 1|-TTYPE1|TTYPE1  = 'OTHER'|-NAXIS1|NAXIS1  = 4" },
        { "TFORM1", "-TFORM1|TFORM1  = '99999999999999999999B'" },
        { "TFORM1", "-TFORM1|TFORM1  = '1Y'" },
        { "TFORM1", "-TFORM1" },
        { "COMPRESSED_DATA", "-TFORM1|TFORM1  = '8B'" },
        { "COMPRESSED_DATA", "-TFORM1|TFORM1  = '1PC'" },
        { "no column", "-TTYPE1|TTYPE1  = 'OTHER'" },
        { "TFIELDS", "-TFIELDS|TFIELDS = 1000" },
        { "THEAP", "THEAP   = 5" },
        { "THEAP", "THEAP   = 9223372036854775807" },
    };

    [Theory]
    [MemberData(nameof(Refusals))]
    public void Hostile_tables_are_refused_by_name(string named, string changes)
    {
        using TemporaryFolder folder = new();
        (string[] cards, byte[] data) = new TiledBytes().Column("COMPRESSED_DATA", "1PB", TiledBytes.Gzip(FitsBytes.Shorts(1, 2, 3)), TiledBytes.Gzip(FitsBytes.Shorts(4, 5, 6)))
            .Hdu(16, [3, 2], [3, 1], "GZIP_1");
        List<string> changed = [.. cards];
        foreach (string change in changes.Split('|'))
        {
            if (change.StartsWith('-'))
                Assert.Equal(1, changed.RemoveAll(card => card.StartsWith(change[1..].PadRight(8) + "=", StringComparison.Ordinal)));
            else
                changed.Add(change);
        }

        StackFormatException e = Assert.Throws<StackFormatException>(() => new FitsBytes().Primary(8, [], []).Hdu(changed, data).Open(folder));
        Assert.Contains(named, e.Message, StringComparison.Ordinal);
        Assert.Contains("in.fits, HDU 1 at byte 2880", e.Message, StringComparison.Ordinal);
        Assert.DoesNotContain('\n', e.Message);
    }

    public static TheoryData<string, int, long, long> Descriptors => new()
    {
        { "lie outside of the heap", 'P', 1000, 0 },
        { "lie outside of the heap", 'P', 10, 100 },
        { "lie outside of the heap", 'P', -1, 0 },
        { "lie outside of the heap", 'P', 1, -1 },
        { "lie outside of the heap", 'Q', long.MaxValue, long.MaxValue },
        { "lie outside of the heap", 'Q', 10, long.MinValue },
        { "no column holds", 'P', 0, 0 },
        { "the tile is broken", 'P', 10, 0 },
        { "the tile is broken", 'Q', 2, 3 },
    };

    [Theory]
    [MemberData(nameof(Descriptors))]
    public void A_descriptor_out_of_the_heap_names_the_row(string named, int type, long elements, long offset)
    {
        using TemporaryFolder folder = new();
        (string[] cards, byte[] data) = new TiledBytes().Column("COMPRESSED_DATA", $"1{(char)type}B", TiledBytes.Gzip(FitsBytes.Shorts(1, 2, 3)), TiledBytes.Gzip(FitsBytes.Shorts(4, 5, 6)))
            .Hdu(16, [3, 2], [3, 1], "GZIP_1");
        byte[] descriptor = [.. BitConverter.GetBytes(elements).Reverse(), .. BitConverter.GetBytes(offset).Reverse()];
        byte[] cell = type == 'Q' ? descriptor : [.. descriptor[4..8], .. descriptor[12..]];
        cell.CopyTo(data, cell.Length);
        using IStackReader reader = new FitsBytes().Primary(8, [], []).Hdu(cards, data).Open(folder);
        StackFormatException e = Assert.Throws<StackFormatException>(() => PassThrough.Stored(reader, 0));
        Assert.Contains(named, e.Message, StringComparison.Ordinal);
        Assert.Contains("row 2 of the tiles", e.Message, StringComparison.Ordinal);
    }
}
