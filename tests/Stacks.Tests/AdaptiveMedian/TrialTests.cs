using Stacks.Abstractions;
using Xunit;

namespace Stacks.Tests.AdaptiveMedian;

/// <summary>
/// What adaptive-median must reach on planted truth (the goals of the first issue): pixels of impulses above 10 local
/// sigmas; those on star light only where they are brighter than the star there. A rate must exceed its goal by two
/// standard errors, counting an event once: the pixels of one track share their fate.
/// </summary>
public class TrialTests
{
    private const int Side = 400;
    private static readonly OracleRules Rules = new(5, 2, 7, 2.4, "both", 1);
    private static readonly Lazy<Figures> Field = new(() => Run(64, (_, _) => SampleFlags.None));

    [Theory]
    [InlineData("Isolated", 0.99)]
    [InlineData("Track", 0.99)]
    [InlineData("PathTrack", 0.90)]
    [InlineData("Block", 0.85)]
    [InlineData("OnStar", 0.90)]
    public void Impulses_are_found(string kind, double goal)
    {
        (int found, int pixels, int events) = Field.Value.Found[Enum.Parse<Planted>(kind)];
        double rate = (double)found / pixels, error = Math.Sqrt(rate * (1 - rate) / events);
        Assert.True(rate - (2 * error) >= goal, $"{kind}: {rate:P2} of {pixels} pixels, standard error {error:P2}; goal {goal:P0}");
    }

    [Fact]
    public void Clean_pixels_are_left()
    {
        double rate = (double)Field.Value.CleanReplaced / Field.Value.Clean;
        Assert.True(rate <= 2e-5, $"{rate:E1} of {Field.Value.Clean}");
    }

    [Fact]
    public void No_core_of_a_star_is_touched_where_nothing_was_planted() =>
        Assert.True(Field.Value.CoreReplaced == 0, $"{Field.Value.CoreReplaced} of {Field.Value.Core}");

    [Fact]
    public void Saturated_pixels_are_untouched()
    {
        Assert.True(Field.Value.Saturated > 0);
        Assert.Equal(0, Field.Value.SaturatedReplaced);
    }

    [Fact]
    public void Stars_without_hits_keep_their_five_pixel_sums_to_the_bit()
    {
        Assert.True(Field.Value.CleanStars > 1000);
        Assert.True(Field.Value.CleanStarsChanged <= 2e-5 * 25 * Field.Value.CleanStars, $"{Field.Value.CleanStarsChanged} of {Field.Value.CleanStars}");
    }

    [Fact]
    public void Bad_columns_and_masked_pixels_cost_no_star()
    {
        Random random = new(5);
        Figures holed = Run(16, (x, _) => x % 20 == 7 || random.NextDouble() < 0.02 ? SampleFlags.Missing : SampleFlags.None);
        Assert.True(holed.CoreReplaced == 0, $"{holed.CoreReplaced} of {holed.Core}");
        Assert.True(holed.CleanReplaced <= 2e-5 * holed.Clean, $"{holed.CleanReplaced} of {holed.Clean}");
    }

    [Fact]
    public void A_width_stated_a_fifth_too_large_costs_no_star()
    {
        Figures wide = Run(8, (_, _) => SampleFlags.None, Rules with { Fwhm = 2.4 * 1.2 });
        Assert.True(wide.CoreReplaced == 0, $"{wide.CoreReplaced} of {wide.Core}");
    }

    private sealed class Figures
    {
        public Dictionary<Planted, (int Found, int Pixels, int Events)> Found { get; } = [];

        public int Clean { get; set; }

        public int CleanReplaced { get; set; }

        public int Core { get; set; }

        public int CoreReplaced { get; set; }

        public int Saturated { get; set; }

        public int SaturatedReplaced { get; set; }

        public int CleanStars { get; set; }

        public int CleanStarsChanged { get; set; }
    }

    private static Figures Run(int frames, Func<int, int, SampleFlags> flag, OracleRules? rules = null)
    {
        Figures figures = new();
        for (int frame = 0; frame < frames; frame++)
        {
            StarFieldTrial trial = new(Side, 1000 + frame);
            for (int i = 0; i < trial.Flags.Length; i++)
                trial.Flags[i] |= flag(i % Side, i / Side);
            (ushort[] output, SampleFlags[] flags) = Cleaning.Run(trial.Samples, trial.Flags, Side, Side, StarFieldTrial.Noise, rules ?? Rules);
            for (int i = 0; i < output.Length; i++)
                Count(figures, trial, flags, i);
            foreach (IGrouping<Planted, int> events in Enumerable.Range(0, output.Length).Where(i => Counts(trial, i)).GroupBy(i => trial.Kind[i]))
            {
                (int found, int pixels, int before) = figures.Found.GetValueOrDefault(events.Key);
                figures.Found[events.Key] = (
                    found + events.Count(i => (flags[i] & SampleFlags.Replaced) != 0),
                    pixels + events.Count(),
                    before + events.Select(i => trial.Event[i]).Distinct().Count());
            }

            foreach ((double x, double y, _) in trial.Centres)
                CountStar(figures, trial, output, (int)Math.Round(x), (int)Math.Round(y));
        }

        return figures;
    }

    private static void Count(Figures figures, StarFieldTrial trial, SampleFlags[] flags, int i)
    {
        bool replaced = (flags[i] & SampleFlags.Replaced) != 0;
        if ((trial.Flags[i] & SampleFlags.Missing) != 0)
            return;
        if ((trial.Flags[i] & SampleFlags.Saturated) != 0)
        {
            figures.Saturated++;
            figures.SaturatedReplaced += replaced ? 1 : 0;
        }
        else if (trial.Kind[i] == Planted.Nothing)
        {
            figures.Clean++;
            figures.CleanReplaced += replaced ? 1 : 0;
            figures.Core += trial.Core[i] ? 1 : 0;
            figures.CoreReplaced += trial.Core[i] && replaced ? 1 : 0;
        }
    }

    /// <summary>An unsaturated pixel hit by more than 10 local sigmas and, on star light, by more than the star's peak.</summary>
    private static bool Counts(StarFieldTrial trial, int i) =>
        trial.Kind[i] != Planted.Nothing
        && trial.Flags[i] == SampleFlags.None
        && trial.Height[i] > 10 * trial.LocalSigma(i)
        && (trial.Stars[i] / StarFieldTrial.Gain <= trial.BackgroundSigma || trial.Height[i] > trial.Peak[i])
        && (trial.Kind[i] == Planted.OnStar) == (trial.Stars[i] / StarFieldTrial.Gain > trial.BackgroundSigma);

    private static void CountStar(Figures figures, StarFieldTrial trial, ushort[] output, int x, int y)
    {
        bool changed = false;
        for (int j = Math.Max(0, y - 2); j <= Math.Min(Side - 1, y + 2); j++)
        {
            for (int i = Math.Max(0, x - 2); i <= Math.Min(Side - 1, x + 2); i++)
            {
                if (trial.Kind[(j * Side) + i] != Planted.Nothing)
                    return;
                changed |= output[(j * Side) + i] != trial.Samples[(j * Side) + i];
            }
        }

        figures.CleanStars++;
        figures.CleanStarsChanged += changed ? 1 : 0;
    }
}
