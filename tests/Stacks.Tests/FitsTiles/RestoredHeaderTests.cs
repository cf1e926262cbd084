using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Formats.Fits.Tiles;
using Xunit;

namespace Stacks.Tests.FitsTiles;

/// <summary>The image's header out of the table's, by hand from Standard 4.0, section 10.1, and back.</summary>
public class RestoredHeaderTests
{
    private static FitsHeader Header(params string[] cards) => new("here", [.. cards.Select(card => new FitsCard(card.PadRight(80)))], 2880);

    private static IEnumerable<string> Cards(FitsHeader header) => header.Cards.Select(card => card.Image.TrimEnd());

    private static readonly string[] Table =
    [
        "XTENSION= 'BINTABLE'           / binary table extension",
        "BITPIX  =                    8 / 8-bit bytes",
        "NAXIS   =                    2 / 2-dimensional binary table",
        "NAXIS1  =                   24 / width of table in bytes",
        "NAXIS2  =                   20 / number of rows in table",
        "PCOUNT  =                  870 / size of special data area",
        "GCOUNT  =                    1 / one data group",
        "TFIELDS =                    2 / number of fields in each row",
        "TTYPE1  = 'COMPRESSED_DATA'",
        "TFORM1  = '1PB(44) '",
        "TTYPE2  = 'ZSCALE  '",
        "TFORM2  = '1D      '",
        "TUNIT2  = 'adu     '",
        "ZIMAGE  =                    T",
        "ZTILE1  =                   30",
        "ZTILE2  =                    1",
        "ZCMPTYPE= 'RICE_1  '",
        "ZNAME1  = 'BLOCKSIZE'",
        "ZVAL1   =                   32",
        "ZQUANTIZ= 'SUBTRACTIVE_DITHER_1'",
        "ZDITHER0=                  123",
        "ZBLANK  =          -2147483648",
    ];

    [Fact]
    public void A_primary_array_comes_back_with_its_cards_in_their_order()
    {
        FitsHeader table = Header(
        [
            .. Table,
            "EXTNAME = 'COMPRESSED_IMAGE'",
            "ZSIMPLE =                    T / conforms to FITS standard",
            "ZBITPIX =                  -32 / array data type",
            "ZNAXIS  =                    2 / number of array dimensions",
            "ZNAXIS1 =                   30",
            "ZNAXIS2 =                   20",
            "ZEXTEND =                    T / more may follow",
            "COMMENT a comment",
            "TTYPE3  = 'of the user'        / there are two columns",
            "ZTILT   =                  1.5 / a keyword of the user",
            "ZVALVE  = 'open    '",
            "LONG    = 'goes on &'",
            "CONTINUE  'and on'",
            "HIERARCH ZIMAGE of old = 3",
            "",
            "COMMENT a comment",
            "ZHECKSUM= '2f4R3c4O2c4O2c4O'   / HDU checksum",
            "ZDATASUM= '1803906202'         / data unit checksum",
            "CHECKSUM= 'c6Hec69dc6Edc69d'   / of the table",
            "DATASUM = '3635039697'         / of the table",
        ]);
        Assert.Equal(
        [
            "SIMPLE  =                    T / conforms to FITS standard",
            "BITPIX  =                  -32 / array data type",
            "NAXIS   =                    2 / number of array dimensions",
            "NAXIS1  =                   30",
            "NAXIS2  =                   20",
            "EXTEND  =                    T / more may follow",
            "COMMENT a comment",
            "TTYPE3  = 'of the user'        / there are two columns",
            "ZTILT   =                  1.5 / a keyword of the user",
            "ZVALVE  = 'open    '",
            "LONG    = 'goes on &'",
            "CONTINUE  'and on'",
            "HIERARCH ZIMAGE of old = 3",
            "",
            "COMMENT a comment",
            "CHECKSUM= '2f4R3c4O2c4O2c4O'   / HDU checksum",
            "DATASUM = '1803906202'         / data unit checksum",
        ],
        Cards(RestoredHeader.Of(table, asPrimary: true)));
    }

    [Fact]
    public void An_extension_comes_back_with_its_counts_behind_the_axes()
    {
        FitsHeader table = Header(
        [
            .. Table,
            "ZTENSION= 'IMAGE   '           / Image extension",
            "ZBITPIX =                  -32 / array data type",
            "ZNAXIS  =                    2 / number of array dimensions",
            "ZNAXIS1 =                   30",
            "ZNAXIS2 =                   20",
            "OBJECT  = 'M13     '",
            "ZPCOUNT =                    0 / number of parameters",
            "ZGCOUNT =                    1 / number of groups",
            "EXTNAME = 'SCI     '           / extension name",
        ]);
        Assert.Equal(
        [
            "XTENSION= 'IMAGE   '           / Image extension",
            "BITPIX  =                  -32 / array data type",
            "NAXIS   =                    2 / number of array dimensions",
            "NAXIS1  =                   30",
            "NAXIS2  =                   20",
            "PCOUNT  =                    0 / number of parameters",
            "GCOUNT  =                    1 / number of groups",
            "OBJECT  = 'M13     '",
            "EXTNAME = 'SCI     '           / extension name",
        ],
        Cards(RestoredHeader.Of(table, asPrimary: false)));
    }

    [Fact]
    public void Integers_whose_missing_value_is_called_zblank_have_it_as_blank()
    {
        string[] image = ["ZBITPIX =                   16", "ZNAXIS  =                    1", "ZNAXIS1 =                    3"];
        Assert.Contains("BLANK   =          -2147483648", Cards(RestoredHeader.Of(Header([.. Table, .. image]), asPrimary: true)));
        string[] both = [.. Cards(RestoredHeader.Of(Header([.. Table, .. image, "BLANK   =                   -1"]), asPrimary: true))];
        Assert.Contains("BLANK   =                   -1", both);
        Assert.DoesNotContain("BLANK   =          -2147483648", both);
    }

    [Theory]
    [InlineData(true)]
    [InlineData(false)]
    public void What_is_written_comes_back_card_for_card(bool isPrimary)
    {
        string[] first = isPrimary
            ? ["SIMPLE  =                    T / yes", "BITPIX  =                   16", "NAXIS   =                    3", "NAXIS1  =                   30", "NAXIS2  =                   20", "NAXIS3  =                    2 / frames", "EXTEND  =                    T"]
            : ["XTENSION= 'IMAGE   '", "BITPIX  =                   16", "NAXIS   =                    3", "NAXIS1  =                   30", "NAXIS2  =                   20", "NAXIS3  =                    2 / frames", "PCOUNT  =                    0 / none", "GCOUNT  =                    1 / one"];
        string[] cards = [.. first, "BZERO   =                32768", "NAXISX  = 'of the user'", "COMMENT", "HISTORY it was so", "HISTORY it was so", "EXTNAME = 'SCI     '"];
        TilePlan plan = new(SampleType.UInt16, [30, 20, 2]);
        List<FitsCard> table = TileHeader.Of(Header(cards).Cards, plan, 1234, 56);
        Assert.Equal(table.Count, TileHeader.Of(Header(cards).Cards, plan, 0, 0).Count);
        Assert.Equal(cards, Cards(RestoredHeader.Of(new FitsHeader("here", table, 2880), isPrimary)));
    }

    [Fact]
    public void A_primary_header_is_bare_unless_it_says_something_of_its_own()
    {
        string[] bare = ["SIMPLE  =                    T", "BITPIX  =                   16", "NAXIS   =                    0", "EXTEND  =                    T", "", "CHECKSUM= '0'", "DATASUM = '0'"];
        FitsHeader table = Header([.. Table, "COMMENT a comment", "OBJECT  = 'M13'"]);
        Assert.True(RestoredHeader.IsBare(Header(bare), table));
        Assert.True(RestoredHeader.IsBare(new FitsHeader("here", TileHeader.BarePrimary(), 2880), table));
        Assert.True(RestoredHeader.IsBare(Header([.. bare, "COMMENT a comment", "OBJECT  = 'M13'"]), table));
        Assert.False(RestoredHeader.IsBare(Header([.. bare, "COMMENT another comment"]), table));
        Assert.False(RestoredHeader.IsBare(Header([.. bare, "OBJECT  = 'M15'"]), table));
        Assert.False(RestoredHeader.IsBare(Header([.. bare, "HISTORY of its own"]), table));
        Assert.False(RestoredHeader.IsBare(Header(["SIMPLE  =                    T", "BITPIX  =                   16", "NAXIS   =                    1", "NAXIS1  =                    1"]), table));
    }
}
