using Stacks.Abstractions;
using Stacks.Filters.AdaptiveMedian;
using Xunit;

namespace Stacks.Tests.AdaptiveMedian;

/// <summary>Single rules of adaptive-median on frames small enough to work out by hand: level 100, sigma 2.</summary>
public class RuleTests
{
    private const int Side = 15;
    private static readonly LinearNoise Noise = LinearNoise.Constant(2);
    private static readonly OracleRules NoSources = new(5, 2, 7, 0, "both", 1);
    private static readonly OracleRules Stars = NoSources with { Fwhm = 2.4 };

    [Fact]
    public void An_isolated_hit_is_replaced_by_the_median_and_flagged_by_its_sign()
    {
        ushort[] frame = Flat();
        frame[At(4, 4)] = 300;
        frame[At(10, 10)] = 20;
        (ushort[] output, SampleFlags[] flags) = Run(frame, NoSources);
        Assert.Equal(Flat(), output);
        Assert.Equal(SampleFlags.ReplacedBright, flags[At(4, 4)]);
        Assert.Equal(SampleFlags.ReplacedDark, flags[At(10, 10)]);
        Assert.Equal(2, flags.Count(f => f != SampleFlags.None));
    }

    [Theory]
    [InlineData(110, false)] // exactly 5 sigma above the median: the rule says more than
    [InlineData(111, true)]
    public void The_threshold_is_in_noise_sigmas(int value, bool replaced)
    {
        ushort[] frame = Flat();
        frame[At(7, 7)] = (ushort)value;
        Assert.Equal(replaced, (Run(frame, NoSources).Flags[At(7, 7)] & SampleFlags.Replaced) != 0);
    }

    [Theory]
    [InlineData("bright", SampleFlags.ReplacedBright, SampleFlags.None)]
    [InlineData("dark", SampleFlags.None, SampleFlags.ReplacedDark)]
    [InlineData("both", SampleFlags.ReplacedBright, SampleFlags.ReplacedDark)]
    public void Polarity_limits_the_sign(string polarity, SampleFlags above, SampleFlags below)
    {
        ushort[] frame = Flat();
        frame[At(4, 4)] = 300;
        frame[At(10, 10)] = 20;
        (_, SampleFlags[] flags) = Run(frame, NoSources with { Polarity = polarity });
        Assert.Equal(above, flags[At(4, 4)]);
        Assert.Equal(below, flags[At(10, 10)]);
    }

    [Fact]
    public void Without_point_sources_the_window_stays_3()
    {
        // A 2 x 2 block is 4 of 9 samples: its 3 x 3 windows are not trusted, and IQR / c is far above sigma there.
        ushort[] frame = Flat();
        frame[At(7, 7)] = frame[At(8, 7)] = frame[At(7, 8)] = frame[At(8, 8)] = 300;
        Assert.Equal(frame, Run(frame, NoSources).Output);
        Assert.Equal(Flat(), Run(frame, Stars).Output);
        Assert.Equal(frame, Run(frame, NoSources with { Polarity = "bright" }).Output);
    }

    [Fact]
    public void A_point_source_is_kept_and_said_to_be_kept()
    {
        ushort[] frame = Flat();
        for (int y = 0; y < Side; y++)
        {
            for (int x = 0; x < Side; x++)
            {
                double distance = ((x - 7) * (x - 7)) + ((y - 7) * (y - 7));
                frame[At(x, y)] += (ushort)Math.Round(400 * Math.Exp(-4 * Math.Log(2) * distance / (2.4 * 2.4)));
            }
        }

        (ushort[] output, SampleFlags[] flags) = Run(frame, Stars);
        Assert.Equal(frame, output);
        Assert.Equal(SampleFlags.KeptAsSource, flags[At(7, 7)]);
        frame[At(8, 7)] = 900; // a hit on the star, brighter than it
        Assert.Equal(SampleFlags.ReplacedBright, Run(frame, Stars).Flags[At(8, 7)]);
    }

    [Fact]
    public void A_source_that_the_edge_or_a_mask_cuts_is_kept()
    {
        // The same star with its centre one pixel outside of the frame: all light on column 0 falls off to the right.
        ushort[] frame = Flat();
        for (int y = 0; y < Side; y++)
        {
            for (int x = 0; x < Side; x++)
            {
                double distance = ((x + 1) * (x + 1)) + ((y - 7) * (y - 7));
                frame[At(x, y)] += (ushort)Math.Round(400 * Math.Exp(-4 * Math.Log(2) * distance / (2.4 * 2.4)));
            }
        }

        Assert.Equal(frame, Run(frame, Stars).Output);

        ushort[] moved = Flat();
        SampleFlags[] given = new SampleFlags[Side * Side];
        for (int y = 0; y < Side; y++)
        {
            for (int x = 6; x < Side; x++)
                moved[At(x, y)] = frame[At(x - 6, y)];
            given[At(5, y)] = SampleFlags.Missing; // the star's centre lies on this column
        }

        Assert.Equal(moved, Cleaning.Run(moved, given, Side, Side, Noise, Stars).Output);
    }

    [Fact]
    public void Saturated_samples_stay_and_lend_no_value()
    {
        ushort[] frame = Flat();
        SampleFlags[] given = new SampleFlags[Side * Side];
        frame[At(7, 7)] = 60000;
        given[At(7, 7)] = SampleFlags.Saturated;
        Assert.Equal(frame, Cleaning.Run(frame, given, Side, Side, Noise, NoSources).Output);

        // All neighbours of a hit saturated: the next window gives the value.
        foreach ((int x, int y) in new[] { (6, 6), (7, 6), (8, 6), (6, 7), (8, 7), (6, 8), (7, 8), (8, 8) })
        {
            frame[At(x, y)] = 100;
            given[At(x, y)] = SampleFlags.Saturated;
        }

        given[At(7, 7)] = SampleFlags.None;
        for (int x = 5; x <= 9; x++)
            frame[At(x, 5)] = frame[At(x, 9)] = 101;
        Assert.Equal(101, Cleaning.Run(frame, given, Side, Side, Noise, NoSources).Output[At(7, 7)]);
    }

    [Fact]
    public void A_defect_is_replaced_whatever_its_value_even_when_saturated()
    {
        ushort[] frame = Flat();
        SampleFlags[] given = new SampleFlags[Side * Side];
        frame[At(3, 3)] = 101;
        given[At(3, 3)] = SampleFlags.Defect;
        frame[At(9, 9)] = 65535;
        given[At(9, 9)] = SampleFlags.Defect | SampleFlags.Saturated;
        frame[At(12, 2)] = 90;
        given[At(12, 2)] = SampleFlags.Defect;
        frame[At(6, 12)] = 77;
        given[At(6, 12)] = SampleFlags.Defect | SampleFlags.Missing; // missing stays missing
        (ushort[] output, SampleFlags[] flags) = Cleaning.Run(frame, given, Side, Side, Noise, NoSources);
        Assert.Equal((100, 100, 100, 77), (output[At(3, 3)], output[At(9, 9)], output[At(12, 2)], output[At(6, 12)]));
        Assert.Equal(SampleFlags.Defect | SampleFlags.ReplacedBright, flags[At(3, 3)]);
        Assert.Equal(SampleFlags.Defect | SampleFlags.ReplacedDark, flags[At(12, 2)]);
        Assert.Equal(given[At(6, 12)], flags[At(6, 12)]);
    }

    [Fact]
    public void Impulses_lend_each_other_no_value()
    {
        // A wide group of defects: only its surroundings give values, from the smallest window that reaches 3 of them.
        ushort[] frame = Flat();
        SampleFlags[] given = new SampleFlags[Side * Side];
        for (int y = 4; y <= 10; y++)
        {
            for (int x = 4; x <= 10; x++)
            {
                frame[At(x, y)] = 5000;
                given[At(x, y)] = SampleFlags.Defect;
            }
        }

        Assert.Equal(Flat(), Cleaning.Run(frame, given, Side, Side, Noise, NoSources).Output);
    }

    [Fact]
    public void A_frame_without_sound_samples_stays()
    {
        ushort[] frame = [500];
        Assert.Equal(frame, Cleaning.Run(frame, [SampleFlags.Defect], 1, 1, Noise, NoSources).Output);
        Assert.Equal([SampleFlags.Defect], Cleaning.Run(frame, [SampleFlags.Defect], 1, 1, Noise, NoSources).Flags);
    }

    [Fact]
    public void Lengths_are_divided_by_the_pitch()
    {
        Random random = new(3);
        ushort[] frame = [.. Enumerable.Range(0, Side * Side).Select(i => (ushort)(100 + random.Next(4) + (random.Next(9) == 0 ? random.Next(200) : 0)))];
        (ushort[] fine, SampleFlags[] fineFlags) = Cleaning.Run(frame, new SampleFlags[Side * Side], Side, Side, Noise, Stars with { Fwhm = 4.8 }, pitch: 2);
        (ushort[] plain, SampleFlags[] plainFlags) = Cleaning.Run(frame, new SampleFlags[Side * Side], Side, Side, Noise, Stars);
        Assert.Equal(plain, fine);
        Assert.Equal(plainFlags, fineFlags);
    }

    [Theory]
    [InlineData("both")]
    [InlineData("bright")]
    public void The_width_of_sources_must_be_stated(string polarity)
    {
        AdaptiveMedianFilter filter = new();
        ParameterValues values = new(filter.Parameters, new Dictionary<string, ParameterValue> { ["polarity"] = ParameterValue.Of(polarity) });
        ParameterException error = Assert.Throws<ParameterException>(
            () => filter.Prepare(Cleaning.LayoutOf<ushort>(9, 9, 1), WorkType.UInt16, values));
        Assert.Equal("psf_fwhm", error.Parameter);
        Assert.DoesNotContain('\n', error.Message);
    }

    [Fact]
    public void Dark_impulses_need_no_width_and_keep_the_large_window()
    {
        AdaptiveMedianFilter filter = new();
        ParameterValues values = new(filter.Parameters, new Dictionary<string, ParameterValue> { ["polarity"] = ParameterValue.Of("dark") });
        IFilterStep step = filter.Prepare(Cleaning.LayoutOf<ushort>(9, 9, 1), WorkType.UInt16, values);
        Assert.Contains(new ResolvedParameter("largest_window", "7", "px"), step.Resolved);
        Assert.Contains(new ResolvedParameter("psf_fwhm", "unused", ""), step.Resolved);
    }

    private static ushort[] Flat() => [.. Enumerable.Repeat((ushort)100, Side * Side)];

    private static int At(int x, int y) => (y * Side) + x;

    private static (ushort[] Output, SampleFlags[] Flags) Run(ushort[] frame, OracleRules rules) =>
        Cleaning.Run(frame, new SampleFlags[frame.Length], Side, Side, Noise, rules);
}
