using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Keywords of detectors and sections: common practice.</summary>
public class CameraKeywordTests
{
    private static HeaderNoise Noise(int[] samples, int width, params string[] cards)
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = new FitsBytes().Primary(16, [width, samples.Length / width], FitsBytes.Shorts(samples), cards).Open(folder);
        return reader.NoiseOf(0);
    }

    private static HeaderNoise Noise(params string[] cards) => Noise([1, 2, 3, 4], 2, cards);

    [Fact]
    public void A_silent_header_says_nothing()
    {
        HeaderNoise noise = Noise();
        Assert.Equal(new HeaderNoise(null, null, null, "", null), noise);
    }

    [Fact]
    public void Egain_comes_before_gain()
    {
        HeaderNoise noise = Noise(FitsBytes.Card("GAIN", 200), FitsBytes.Card("EGAIN", 1.25), FitsBytes.Card("RDNOISE", 3.5));
        Assert.Equal((1.25, 3.5, "EGAIN, RDNOISE", null), (noise.Gain, noise.ReadNoise, noise.Origin, noise.Doubt));
    }

    [Fact]
    public void Gain_carries_a_doubt()
    {
        HeaderNoise noise = Noise(FitsBytes.Card("GAIN", 2.1));
        Assert.Equal(2.1, noise.Gain);
        Assert.Contains("setting", noise.Doubt, StringComparison.Ordinal);
    }

    [Fact]
    public void Zero_stands_for_not_known()
    {
        HeaderNoise noise = Noise(FitsBytes.Card("ATODGAIN", "0.0"), FitsBytes.Card("READNSE", "0.0"));
        Assert.Equal((null, null), (noise.Gain, noise.ReadNoise));
    }

    [Theory]
    [InlineData("ELECTRONS", 1.0)]
    [InlineData("electron", 1.0)]
    [InlineData("electron/s", null)]
    [InlineData("adu", 2.1)]
    public void The_unit_decides_whether_a_gain_applies(string unit, double? gain)
    {
        HeaderNoise noise = Noise(FitsBytes.Text("BUNIT", unit), FitsBytes.Card("EGAIN", 2.1));
        Assert.Equal(gain, noise.Gain);
        Assert.Equal(gain is null, noise.Doubt is not null);
    }

    [Fact]
    public void A_missing_pedestal_is_not_zero() => Assert.Null(Noise(FitsBytes.Card("EGAIN", 2)).Pedestal);

    [Fact]
    public void Pedestal_by_keyword()
    {
        Assert.Equal(200, Noise(FitsBytes.Card("PEDESTAL", 200)).Pedestal);
        Assert.Equal(0, Noise(FitsBytes.Card("PEDESTAL", 0)).Pedestal);
        HeaderNoise toAdd = Noise(FitsBytes.Card("PEDESTAL", -100));
        Assert.Equal(100, toAdd.Pedestal);
        Assert.Contains("correction to add", toAdd.Doubt, StringComparison.Ordinal);
    }

    // 4 x 3 samples: the last two columns are overscan.
    private static readonly int[] Samples = [900, 901, 10, 13, 902, 903, 11, 99, 904, 905, 12, -7];

    [Theory]
    [InlineData("[3:4,1:3]", 11.5)] // -7 10 11 12 13 99
    [InlineData("[4:3,3:1]", 11.5)] // reversed
    [InlineData(" [ 3:3 , 1:3 ] ", 11)]
    [InlineData("[3:4,2:2]", 55)]
    public void Pedestal_is_the_median_of_the_overscan(string section, double expected)
    {
        HeaderNoise noise = Noise(Samples, 4, FitsBytes.Text("BIASSEC", section), FitsBytes.Card("PEDESTAL", 1));
        Assert.Equal(expected, noise.Pedestal);
        Assert.Contains("BIASSEC", noise.Origin, StringComparison.Ordinal);
    }

    [Fact]
    public void The_overscan_is_in_value_units_and_without_missing_samples()
    {
        string[] cards = [FitsBytes.Text("BIASSEC", "[3:4,1:3]"), FitsBytes.Card("BSCALE", "0.5"), FitsBytes.Card("BZERO", "100"), FitsBytes.Card("BLANK", 99)];
        Assert.Equal(100 + (0.5 * 11), Noise(Samples, 4, cards).Pedestal); // -7 10 11 12 13
    }

    [Fact]
    public void The_overscan_is_that_of_the_very_frame()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = new FitsBytes()
            .Primary(16, [2, 1, 2], FitsBytes.Shorts(1, 50, 2, 60), FitsBytes.Text("BIASSEC", "[2:2,1:1]"), FitsBytes.Card("BZERO", 32768)).Open(folder);
        Assert.Equal((50 + 32768, 60 + 32768), (reader.NoiseOf(0).Pedestal, reader.NoiseOf(1).Pedestal));
    }

    [Theory]
    [InlineData("[3:5,1:3]")]
    [InlineData("[1:2,1:2304]")]
    [InlineData("[0:2,1:1]")]
    [InlineData("[1:2]")]
    [InlineData("[1:99999999999999999999,1:1]")]
    [InlineData("overscan")]
    public void A_section_that_cannot_be_is_a_doubt_and_no_pedestal(string section)
    {
        HeaderNoise noise = Noise(Samples, 4, FitsBytes.Text("BIASSEC", section));
        Assert.Null(noise.Pedestal);
        Assert.Contains("BIASSEC", noise.Doubt, StringComparison.Ordinal);
    }

    [Fact]
    public void Figures_for_each_output_count_when_they_agree()
    {
        string[] same = ["HIERARCH ESO DET OUT1 CONAD = 1.2", "HIERARCH ESO DET OUT2 CONAD = 1.20", "HIERARCH ESO DET OUT1 RON = 3.0"];
        Assert.Equal((1.2, 3.0), (Noise(same).Gain, Noise(same).ReadNoise));
        HeaderNoise differ = Noise("HIERARCH ESO DET OUT1 CONAD = 1.2", "HIERARCH ESO DET OUT2 CONAD = 1.3");
        Assert.Null(differ.Gain);
        Assert.Contains("differ", differ.Doubt, StringComparison.Ordinal);
    }

    [Fact]
    public void Facts_come_from_the_first_keyword_that_knows()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = new FitsBytes()
            .Primary(16, [], [], FitsBytes.Text("OBJECT", "M 13"), FitsBytes.Card("EXPTIME", 30))
            .Image(16, [2, 1], FitsBytes.Shorts(1, 2), FitsBytes.Card("EXPTIME", 60), FitsBytes.Card("ATODGAIN", "0.0"), FitsBytes.Card("GAIN", 2), FitsBytes.Card("RDNOISE", "0"))
            .Open(folder);
        Assert.Equal(
            ["object: M 13 (OBJECT)", "exposure: 60 s (EXPTIME)", "gain: 2 e-/ADU (GAIN)", "unit: ADU"],
            reader.Facts.Select(fact => $"{fact.Label}: {fact.Value}"));
    }

    [NeedsFact(Needs.RealDataNeed)]
    public void A_real_multi_extension_file()
    {
        using IStackReader reader = new FitsFormat().Open(RealData.File("astro", "gmos_multi.fits"), new ReadOptions());

        // Its cards, read by eye: GAIN = 2.1, RDNOISE = 3.5, BIASSEC = '[1:32,1:2304]' on frames of 132 x 288.
        HeaderNoise noise = reader.NoiseOf(0);
        Assert.Equal((2.1, 3.5, null), (noise.Gain, noise.ReadNoise, noise.Pedestal));
        Assert.Contains("GAIN is a setting", noise.Doubt, StringComparison.Ordinal);
        Assert.Contains("BIASSEC", noise.Doubt, StringComparison.Ordinal);
        Assert.Contains(reader.Facts, fact => fact is { Label: "object", Value: "NGC1068 (OBJECT)" });
        Assert.Contains(reader.Facts, fact => fact is { Label: "observed", Value: "2001-09-10 (DATE-OBS)" });
        Assert.Contains(reader.Facts, fact => fact is { Label: "gain", Value: "2.1 e-/ADU (GAIN)" });
    }
}
