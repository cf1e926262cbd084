using MathNet.Numerics.Distributions;
using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>Where a run takes its noise model from, and what it says when model and frame disagree.</summary>
public class NoiseInRunTests
{
    private const int Side = 100;
    private static readonly FrameLayout Frame = new() { Width = Side, Height = Side, SampleType = SampleType.UInt16, QuantisationStep = 1 };

    /// <summary>Sky of 20 electrons over a pedestal of 200 ADU; gain 1.46 e-/ADU, read noise 3.2 e-.</summary>
    private static ushort[] Sky(int seed)
    {
        Random random = new(seed);
        return [.. Enumerable.Range(0, Side * Side).Select(_ =>
            (ushort)Math.Round(200 + (Normal.Sample(random, 20, Math.Sqrt(20 + (3.2 * 3.2))) / 1.46)))];
    }

    private static NoiseSection Section(NoiseOrigin from, double? gain = null, double? readNoise = null, double? pedestal = null, double? sigma = null, string? channel = null) =>
        new() { Place = new RecipePlace("recipe.toml", 3, 1), From = from, Gain = gain, ReadNoise = readNoise, Pedestal = pedestal, Sigma = sigma, Channel = channel };

    private static (RunResult Result, List<NoiseModel?> Seen) Run(Bench bench, params NoiseSection[] sections)
    {
        List<NoiseModel?> seen = [];
        FakeFilter look = new("look", FilterKind.Selective, (_, _, _, context) => seen.Add(context.Noise)) { NeedsNoise = true };
        RunPlan plan = bench.Plan(look) with { Workers = 1 };
        return (StackRun.Execute(plan with { Recipe = plan.Recipe with { Noise = sections } }, null, CancellationToken.None), seen);
    }

    private static Bench WithSky(int frames = 3)
    {
        Bench bench = new();
        for (int f = 0; f < frames; f++)
            bench.Source.Add(Frame, Sky(f + 1));
        return bench;
    }

    [Fact]
    public void Values_of_the_recipe_give_the_formulas_variance()
    {
        using Bench bench = WithSky();
        (RunResult result, List<NoiseModel?> seen) = Run(bench, Section(NoiseOrigin.Values, 1.46, 3.2, 200));
        Assert.Equal(3, seen.Count);

        // METHODS 3: max(v - pedestal, 0) / gain + (read_noise / gain)^2 + q^2 / 12.
        Assert.Equal((100 / 1.46) + (3.2 / 1.46 * (3.2 / 1.46)) + (1 / 12.0), seen[0]!.Variance(0, 0, 300), 1e-12);
        Assert.Empty(result.Warnings);
        Assert.StartsWith("recipe: variance ", Assert.Single(result.Provenance!.Noise), StringComparison.Ordinal);
    }

    [Fact]
    public void A_pedestal_taken_for_signal_is_warned_of_once_with_first_frame_and_count()
    {
        using Bench bench = WithSky();
        bench.Source.Add(Frame, new ushort[Side * Side]);
        (RunResult result, _) = Run(bench, Section(NoiseOrigin.Values, 1.46, 3.2, 0));
        string warning = Assert.Single(result.Warnings, w => w.Contains("pedestal", StringComparison.Ordinal));
        Assert.Contains("frame 0: measured noise is 0.3", warning, StringComparison.Ordinal);
        Assert.Contains("in 4 of 4 frames", warning, StringComparison.Ordinal);
        Assert.All(bench.Format.Last!.Ledger, r => Assert.True(r.Flags.HasFlag(LedgerFlags.NoiseDisagrees)));
        Assert.Contains(warning, result.Provenance!.Remarks);
    }

    [Fact]
    public void A_gain_that_is_a_camera_setting_is_warned_of()
    {
        using Bench bench = WithSky();
        (RunResult result, _) = Run(bench, Section(NoiseOrigin.Values, 120, 3.2, 200));
        Assert.Contains("gain too high", Assert.Single(result.Warnings), StringComparison.Ordinal);
    }

    [Fact]
    public void Header_values_are_used_and_those_of_the_recipe_come_first()
    {
        using Bench bench = WithSky();
        bench.Source.Header = _ => new HeaderNoise(9, 3.2, 200, "GAIN, RDNOISE, PEDESTAL", "GAIN may be a camera setting");
        (RunResult result, List<NoiseModel?> seen) = Run(bench, Section(NoiseOrigin.Header, gain: 1.46));
        Assert.Equal((100 / 1.46) + (3.2 / 1.46 * (3.2 / 1.46)) + (1 / 12.0), seen[0]!.Variance(0, 0, 300), 1e-12);
        Assert.Equal(["GAIN may be a camera setting"], result.Warnings);
        Assert.StartsWith("header (GAIN, RDNOISE, PEDESTAL): ", Assert.Single(result.Provenance!.Noise), StringComparison.Ordinal);
    }

    [Fact]
    public void What_neither_header_nor_recipe_state_is_refused_with_a_remedy()
    {
        using Bench bench = WithSky();
        bench.Source.Header = _ => new HeaderNoise(1.46, 3.2, null, "EGAIN, RDNOISE", null);
        string message = Assert.Throws<RecipeException>(() => Run(bench, Section(NoiseOrigin.Header))).Message;
        Assert.StartsWith("recipe.toml:3:1: the header of frame 0 of in.mem states no pedestal", message, StringComparison.Ordinal);
        Assert.Contains("add pedestal", message, StringComparison.Ordinal);
        Assert.Contains("no usable gain", Assert.Throws<RecipeException>(() => Run(bench, Section(NoiseOrigin.Values, null, 3, 0))).Message, StringComparison.Ordinal);
        Assert.Contains("no usable read noise", Assert.Throws<RecipeException>(() => Run(bench, Section(NoiseOrigin.Values, 1, null, 0))).Message, StringComparison.Ordinal);
        Assert.Contains("no pedestal", Assert.Throws<RecipeException>(() => Run(bench, Section(NoiseOrigin.Values, 1, 3))).Message, StringComparison.Ordinal);
        Assert.Equal(["in.mem"], bench.FilesThere);
        Run(bench, Section(NoiseOrigin.Header, pedestal: 200));
    }

    [Fact]
    public void A_constant_sigma_is_measured_on_each_frame()
    {
        using Bench bench = WithSky();
        (RunResult result, List<NoiseModel?> seen) = Run(bench, Section(NoiseOrigin.Frame));

        // sqrt(20 + 3.2^2) / 1.46 ADU, and the rounding to whole ADU.
        double expected = Math.Sqrt(((20 + (3.2 * 3.2)) / (1.46 * 1.46)) + (1 / 12.0));
        Assert.All(seen, m => Assert.InRange(m!.Sigma(0, 0, 12345), 0.93 * expected, 1.07 * expected));
        Assert.Equal(3, seen.Select(m => m!.Describe()).Distinct().Count());
        Assert.Empty(result.Warnings);
        Assert.All(bench.Format.Last!.Ledger, r => Assert.Equal(r.NoiseBefore, r.NoiseAfter));
        Assert.All(bench.Format.Last.Ledger, r => Assert.InRange(r.Level, 212, 215));
    }

    [Fact]
    public void A_frame_without_measurable_noise_is_left_as_it_is_and_named()
    {
        using Bench bench = WithSky(1);
        bench.Source.Add(Frame, new ushort[Side * Side]).Add(Frame with { Width = 5, Height = 5 }, new ushort[25]);
        (RunResult result, List<NoiseModel?> seen) = Run(bench, Section(NoiseOrigin.Frame));
        Assert.Single(seen);
        string warning = Assert.Single(result.Warnings);
        Assert.StartsWith("frame 1: its noise cannot be measured", warning, StringComparison.Ordinal);
        Assert.Contains("in 2 of 3 frames", warning, StringComparison.Ordinal);
        Assert.Equal(
            [LedgerFlags.None, LedgerFlags.NoiseNotMeasurable, LedgerFlags.NoiseNotMeasurable],
            bench.Format.Last!.Ledger.Select(r => r.Flags));
    }

    [Fact]
    public void Each_channel_has_its_own_model_and_one_without_is_refused()
    {
        using Bench bench = new();
        for (int c = 0; c < 4; c++)
            bench.Source.Add(Frame with { Channel = c % 2, ChannelName = c % 2 == 0 ? "red" : "green" }, Sky(c + 1));
        NoiseSection red = Section(NoiseOrigin.Values, sigma: 3.77, channel: "red"), green = Section(NoiseOrigin.Values, sigma: 3.78, channel: "1");
        (RunResult result, List<NoiseModel?> seen) = Run(bench, red, green);
        Assert.Equal([3.77, 3.78, 3.77, 3.78], seen.Select(m => Math.Round(m!.Sigma(0, 0, 0), 9)));
        Assert.Equal(["channel red, recipe: sigma 3.77 ADU at every level", "channel green, recipe: sigma 3.78 ADU at every level"], result.Provenance!.Noise);

        RecipeException fault = Assert.Throws<RecipeException>(() => Run2(bench, red));
        Assert.Contains("look needs a noise model, and none is given for frame 1 (channel 1)", fault.Message, StringComparison.Ordinal);
        static void Run2(Bench bench, NoiseSection only)
        {
            File.Delete(bench.Output);
            File.Delete(bench.Output + ".prov.json");
            File.Delete(bench.Output + ".mask");
            Run(bench, only);
        }
    }

    [Fact]
    public void A_mosaic_hands_each_sublattice_its_part_of_the_model()
    {
        using Bench bench = new();
        bench.Source.Add(Frame with { Lattice = new Lattice(2, 2) }, Sky(1));
        (RunResult result, List<NoiseModel?> seen) = Run(bench, Section(NoiseOrigin.Values, sigma: 3.77));
        Assert.Equal(4, seen.Count);
        Assert.Empty(result.Warnings);
    }
}
