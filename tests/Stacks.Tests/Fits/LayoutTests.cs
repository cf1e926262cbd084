using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

public class LayoutTests
{
    private static FrameLayout Layout(int bitPix, params string[] cards)
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = new FitsBytes().Primary(bitPix, [2, 3], new byte[6 * Math.Abs(bitPix) / 8], cards).Open(folder);
        return reader.Layout(0);
    }

    [Theory]
    [InlineData(8, "", SampleType.UInt8)]
    [InlineData(8, "-128", SampleType.Int8)]
    [InlineData(16, "", SampleType.Int16)]
    [InlineData(16, "32768", SampleType.UInt16)]
    [InlineData(16, "3.276800E4", SampleType.UInt16)]
    [InlineData(16, "3.2768D+04", SampleType.UInt16)]
    [InlineData(32, "", SampleType.Int32)]
    [InlineData(32, "2147483648", SampleType.UInt32)]
    [InlineData(64, "", SampleType.Int64)]
    [InlineData(64, "9223372036854775808", SampleType.UInt64)]
    [InlineData(-32, "", SampleType.Float32)]
    [InlineData(-64, "", SampleType.Float64)]
    public void A_sign_conventions_bzero_is_a_type(int bitPix, string zero, SampleType type)
    {
        FrameLayout layout = Layout(bitPix, zero.Length == 0 ? [] : [FitsBytes.Card("BZERO", zero), FitsBytes.Card("BSCALE", "1")]);
        Assert.Equal((type, ValueTransform.Identity), (layout.SampleType, layout.Transform));
        Assert.Equal(type.IsInteger() ? 1 : 0, layout.QuantisationStep);
        Assert.Equal(type.IsInteger() ? type.Maximum() : null, layout.SaturationStored);
    }

    [Theory]
    [InlineData(16, "1500.0", "0.045777764213996", 0.045777764213996, 1500.0)]
    [InlineData(16, "32768", "2", 2, 32768)] // not the sign convention: that one has BSCALE 1
    [InlineData(16, "32767", "1", 1, 32767)]
    [InlineData(8, "32768", "1", 1, 32768)] // nor with another BITPIX
    [InlineData(32, "0", "-0.5", -0.5, 0)]
    [InlineData(-32, "32768", "1", 1, 32768)]
    public void Any_other_scaling_is_a_transform(int bitPix, string zero, string scale, double expectedScale, double expectedZero)
    {
        FrameLayout layout = Layout(bitPix, FitsBytes.Card("BZERO", zero), FitsBytes.Card("BSCALE", scale));
        Assert.Equal(SampleEncoding.PlainType(bitPix), layout.SampleType);
        Assert.Equal(new ValueTransform(expectedScale, expectedZero), layout.Transform);
        Assert.Equal(bitPix > 0 ? Math.Abs(expectedScale) : 0, layout.QuantisationStep);
    }

    [Fact]
    public void A_negative_scale_puts_saturation_at_the_low_end_of_the_type() =>
        Assert.Equal(-32768, Layout(16, FitsBytes.Card("BSCALE", "-1.5")).SaturationStored);

    [Theory]
    [InlineData("0")]
    [InlineData("'one'")]
    [InlineData("1.0E999")]
    [InlineData("NaN")]
    public void A_scale_without_meaning_is_refused(string scale)
    {
        StackFormatException e = Assert.Throws<StackFormatException>(() => Layout(16, FitsBytes.Card("BSCALE", scale)));
        Assert.Contains("BSCALE", e.Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Blank_is_a_stored_value_of_integers()
    {
        Assert.Equal(-32768, Layout(16, FitsBytes.Card("BLANK", -32768)).Blank);
        Assert.Equal(0, Layout(16, FitsBytes.Card("BLANK", -32768), FitsBytes.Card("BZERO", 32768)).Blank);
        Assert.Equal(((Int128)1 << 64) - 1, Layout(64, FitsBytes.Card("BLANK", long.MaxValue), FitsBytes.Card("BZERO", "9223372036854775808")).Blank);
        Assert.Equal(127, Layout(8, FitsBytes.Card("BLANK", 255), FitsBytes.Card("BZERO", -128)).Blank);
        Assert.Null(Layout(-32, FitsBytes.Card("BLANK", 5)).Blank);
        Assert.Null(Layout(16).Blank);
    }

    [Fact]
    public void Saturation_comes_from_the_header_in_value_units()
    {
        Assert.Equal(60000, Layout(16, FitsBytes.Card("BZERO", 32768), FitsBytes.Card("SATURATE", 60000)).SaturationStored);
        Assert.Equal(65535, Layout(16, FitsBytes.Card("BZERO", 32768), FitsBytes.Card("SATLEVEL", 1e6)).SaturationStored);
        Assert.Equal(65535, Layout(16, FitsBytes.Card("BZERO", 32768), FitsBytes.Card("SATURATE", 0)).SaturationStored);
        Assert.Equal(100, Layout(16, FitsBytes.Card("BSCALE", "0.5"), FitsBytes.Card("BZERO", "10"), FitsBytes.Card("SATURATE", 60)).SaturationStored);
        Assert.Equal(50000, Layout(-32, FitsBytes.Card("SATURATE", 50000)).SaturationStored);
        Assert.Null(Layout(-32).SaturationStored);
    }

    [Fact]
    public void The_unit_is_the_files_own()
    {
        Assert.Equal("ADU", Layout(16).Unit);
        Assert.Equal("ADU", Layout(16, FitsBytes.Text("BUNIT", "")).Unit);
        Assert.Equal("MJy/sr", Layout(16, FitsBytes.Text("BUNIT", "MJy/sr")).Unit);
    }

    [Theory]
    [InlineData("BAYERPAT", "RGGB", 2, 2)] // common practice: four letters are 2 x 2
    [InlineData("CFAPAT", "gbrg", 2, 2)]
    [InlineData("COLORTYP", "CMYG", 2, 2)]
    [InlineData("COLORTYP", "MONO", 1, 1)]
    [InlineData("COLORTYP", "GREY", 1, 1)]
    [InlineData("COLORTYP", "NONE", 1, 1)]
    [InlineData("BAYERPAT", "RG/GB", 2, 2)] // rows parted
    [InlineData("BAYERPAT", "RGRG/GBGB", 2, 2)] // said twice over
    [InlineData("BAYERPAT", "RGRGGBGBRGRGGBGB", 2, 2)] // 4 x 4 letters, period 2
    [InlineData("BAYERPAT", "GBGGRGRGRBGBGBGGRGGRGGBGBGBRGRGRGGBG", 6, 6)] // 36 letters
    [InlineData("BAYERPAT", "RGGBRGGB", 1, 1)] // 8 letters: 2 x 4 or 4 x 2 cannot be told
    [InlineData("BAYERPAT", "TRUE", 1, 1)]
    [InlineData("OBJECT", "RGGB", 1, 1)]
    public void Mosaics(string keyword, string pattern, int periodX, int periodY) =>
        Assert.Equal(new Lattice(periodX, periodY), Layout(16, FitsBytes.Text(keyword, pattern)).Lattice);

    [Fact]
    public void Planes_of_cubes_and_hypercubes_are_frames()
    {
        using TemporaryFolder folder = new();
        byte[] data = FitsBytes.Shorts([.. Enumerable.Range(0, 2 * 2 * 3 * 4)]);
        using IStackReader cube = new FitsBytes().Primary(16, [2, 2, 12], data).Open(folder);
        using IStackReader hyper = new FitsBytes().Primary(16, [2, 2, 3, 4], data).Open(folder, name: "hyper.fits");
        Assert.Equal((12, 12), (cube.FrameCount, hyper.FrameCount));
        for (int frame = 0; frame < 12; frame++)
        {
            // The plane f holds the integers 4f to 4f + 3 by construction.
            byte[] expected = new byte[8];
            for (int i = 0; i < 4; i++)
                BitConverter.TryWriteBytes(expected.AsSpan(2 * i), (short)((4 * frame) + i));
            Assert.Equal(expected, PassThrough.Stored(cube, frame));
            Assert.Equal(expected, PassThrough.Stored(hyper, frame));
        }
    }

    [Theory]
    [InlineData("T", 50000)]
    [InlineData("F", 65535)]
    public void Keywords_are_inherited_where_inherit_says_so(string inherit, double saturation)
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = new FitsBytes()
            .Primary(16, [], [], FitsBytes.Card("SATURATE", 50000), FitsBytes.Card("BZERO", 5))
            .Image(16, [2, 2], FitsBytes.Shorts(1, 2, 3, 4), FitsBytes.Card("BZERO", 32768), FitsBytes.Card("INHERIT", inherit))
            .Open(folder);
        Assert.Equal(saturation, reader.Layout(0).SaturationStored);
        Assert.Equal(SampleType.UInt16, reader.Layout(0).SampleType);
    }
}
