using MathNet.Numerics.Distributions;
using Stacks.Abstractions;
using Stacks.Filters.AdaptiveMedian;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>Why mosaics are split: a hit on a dark sub-lattice is dimmer than its bright neighbours.</summary>
public class MosaicHitsTests
{
    private const int Side = 128;

    [Fact]
    public void Hits_on_a_mosaic_are_found_in_its_sublattices_and_missed_in_the_whole()
    {
        // Four colours at 500, 1500, 1500 and 4000 ADU, noise 20 ADU; hits of 30 sigmas on the darkest one.
        Random random = new(3);
        int[] levels = [500, 1500, 1500, 4000];
        ushort[] samples = [.. Enumerable.Range(0, Side * Side).Select(i =>
            (ushort)Math.Round(Normal.Sample(random, levels[(i % Side % 2) + (2 * (i / Side % 2))], 20)))];
        int[] hits = [.. Enumerable.Range(0, 64).Select(h => (8 + (16 * (h / 8))) * Side + 8 + (16 * (h % 8)))];
        foreach (int hit in hits)
            samples[hit] += 600;

        using Bench bench = new();
        bench.Source.Add(new FrameLayout { Width = Side, Height = Side, SampleType = SampleType.UInt16, QuantisationStep = 1, Lattice = new Lattice(2, 2) }, samples);
        PlannedStep step = Bench.Step(new AdaptiveMedianFilter(), null, ("psf_fwhm", ParameterValue.Of(0)), ("largest_window", ParameterValue.Of(3)));
        NoiseSection noise = new() { Place = new RecipePlace("recipe.toml", 1, 1), From = NoiseOrigin.Frame };
        int Found(Lattice? mosaic, string output)
        {
            RunPlan plan = bench.Plan() with { Steps = [step], OutputPath = output };
            MemoryWriter written = bench.Run(plan with { Recipe = plan.Recipe with { Noise = [noise], Input = new InputSection { Mosaic = mosaic } } });
            return hits.Count(h => (written.Flags[0][h] & (byte)SampleFlags.ReplacedBright) != 0);
        }

        Assert.Equal(hits.Length, Found(null, bench.Output));
        Assert.Equal(0, Found(Lattice.Single, bench.Output + "2"));
    }
}
