using Stacks.Abstractions;
using Stacks.Pipeline;
using Stacks.Tests.Engine;
using Xunit;

namespace Stacks.Tests.Plans;

/// <summary>Everything a recipe and a stack can disagree about is found before the run.</summary>
public sealed class RunPlannerTests : IDisposable
{
    private const string Noise = "[noise]\nfrom = \"values\"\ngain = 2\nread_noise = 4\npedestal = 100\n";

    private static readonly ParameterSpec Threshold = new()
    {
        Name = "threshold",
        Kind = ParameterKind.Number,
        Unit = "noise sigmas",
        Minimum = 1,
        Maximum = 100,
        Default = ParameterValue.Of(5.0),
        Meaning = "How far off",
        WhenRaised = "fewer",
        WhenLowered = "more",
    };

    private readonly PlanBench bench = new();

    public RunPlannerTests() => bench.Filters.AddRange(
    [
        PlanBench.Select("select"),
        PlanBench.Smooth("smooth"),
        new FakeFilter("needy", FilterKind.Selective, (_, _, _, _) => { }) { NeedsNoise = true },
        new FakeFilter("tuned", FilterKind.Selective, (_, _, _, _) => { }) { Parameters = [Threshold, Threshold with { Name = "limit", Default = null }] },
        new FakeFilter("real", FilterKind.Smoothing, (input, _, output, _) => input.CopyTo(output)) { WorkTypes = [WorkType.Float32, WorkType.Float64] },
    ]);

    public void Dispose() => bench.Dispose();

    [Fact]
    public void A_plan_resolves_everything()
    {
        using RunPlan plan = bench.Plan(Noise + "[[step]]\nfilter = \"tuned\"\nlimit = 3\n[[step]]\nfilter = \"real\"\n");

        Assert.Equal(bench.File("in.sky"), plan.Reader.Path);
        Assert.Equal(Path.Combine(bench.Out, "in.sky"), plan.OutputPath);
        Assert.Same(bench.Sky, plan.OutputFormat);
        Assert.True(plan.WriteMask);
        Assert.Equal(["Sky", "Sky"], plan.FormatOrigins.Select(o => o.Assembly));
        Assert.Equal((5.0, 3.0), (plan.Steps[0].Values.Number("threshold"), plan.Steps[0].Values.Number("limit")));
        FrameKind kind = Assert.Single(plan.Kinds);
        Assert.Equal([WorkType.UInt16, WorkType.Float32], kind.Steps.Select(s => s.WorkType));
        Assert.Equal(SampleType.Float32, kind.Output);
        // variance = (v - 100) / 2 + (4 / 2)^2 + 1 / 12
        Assert.Equal("recipe: variance 0.5 ADU x (v - 100 ADU) + 4.08333 ADU^2", kind.Noise);
    }

    [Theory]
    [InlineData("[[step]]\nfilter = \"selekt\"", "r.toml:2:1: unknown filter selekt; did you mean select? known are ")]
    [InlineData("[[step]]\nfilter = \"tuned\"\nlimit = 3\ntreshold = 4", "r.toml:4:1: unknown key treshold in a step with filter tuned; did you mean threshold? known are filter, channel, threshold, limit")]
    [InlineData("[[step]]\nfilter = \"tuned\"\nlimit = 3\nthreshold = 0.5", "r.toml:4:1: threshold of filter tuned: 0.5 is not allowed; give 1 to 100 (noise sigmas)")]
    [InlineData("[[step]]\nfilter = \"tuned\"\nlimit = true", "r.toml:3:1: limit of filter tuned: true is not allowed")]
    [InlineData("[[step]]\nfilter = \"tuned\"", "r.toml:2:1: limit of filter tuned: must be stated")]
    [InlineData("[[step]]\nfilter = \"needy\"", "r.toml:2:1: filter needy needs a noise model and the recipe has none; add [noise]")]
    [InlineData("[[step]]\nfilter = \"select\"\nchannel = 3", "r.toml:3:1: no frame of the stack has channel 3; its channels are 0")]
    [InlineData("[[noise]]\nchannel = \"dapi\"\nfrom = \"frame\"", "r.toml:2:1: no frame of the stack has channel dapi")]
    [InlineData("[noise]\nfrom = \"header\"\npedestal = 0\n[[step]]\nfilter = \"needy\"", "states no usable gain")]
    [InlineData("[output]\nformat = \"fit\"", "r.toml:2:1: unknown output format fit")]
    public void Faults_are_named_with_their_place(string recipe, string says)
    {
        RecipeException fault = bench.Refused(recipe);

        Assert.Contains(says, fault.Message, StringComparison.Ordinal);
        Assert.Equal(78, fault.ExitCode);
        Assert.Equal(bench.Sky.Opened, bench.Sky.Closed);
    }

    [Fact]
    public void A_channel_without_noise_model_is_named()
    {
        bench.Sky.Layouts[0] = bench.Sky.Layouts[0] with { Channel = 0, ChannelName = "blue" };
        bench.Sky.Layouts.Add(bench.Sky.Layouts[0] with { Channel = 1, ChannelName = "red" });

        Assert.Contains("filter needy has no noise model for channel red",
            bench.Refused("[[noise]]\nchannel = 0\nfrom = \"frame\"\n[[step]]\nfilter = \"needy\"").Message, StringComparison.Ordinal);
        using RunPlan plan = bench.Plan("[[noise]]\nfrom = \"frame\"\n[[noise]]\nchannel = \"red\"\nfrom = \"values\"\nsigma = 2\n[[step]]\nfilter = \"needy\"\nchannel = \"red\"");
        Assert.Equal([0, 1], plan.Kinds.Select(k => k.Steps.Count));
        Assert.Equal(["measured on each frame", "recipe: sigma 2 ADU at every level"], plan.Kinds.Select(k => k.Noise));
    }

    [Fact]
    public void Header_noise_is_looked_up_for_every_extension()
    {
        bench.Sky.Layouts[0] = bench.Sky.Layouts[0] with { Extension = "A" };
        bench.Sky.Layouts.Add(bench.Sky.Layouts[0] with { Extension = "B" });
        bench.Sky.Header = frame => frame == 0 ? new HeaderNoise(2, 4, 100, "GAIN", null) : new HeaderNoise(2, 4, null, "GAIN", null);

        Assert.Contains("frame 1", bench.Refused("[noise]\nfrom = \"header\"\n[[step]]\nfilter = \"needy\"").Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Steps_are_prepared_on_every_shape_of_sublattice()
    {
        bench.Sky.Layouts[0] = bench.Sky.Layouts[0] with { Width = 7, Height = 4 };
        using RunPlan plan = bench.Plan("[input]\nmosaic = \"2x2\"\n[[step]]\nfilter = \"select\"");

        IEnumerable<(int, int, int, bool)> seen = ((FakeFilter)bench.Filters[0]).Prepared
            .Select(p => (p.Layout.Width, p.Layout.Height, p.Layout.Pitch, p.Layout.Lattice.IsSingle)).Distinct();
        Assert.Equal([(3, 2, 2, true), (4, 2, 2, true)], seen.Order());
    }

    [Theory]
    [InlineData("auto", "select", SampleType.UInt16)]
    [InlineData("auto", "smooth", SampleType.Float32)]
    [InlineData("same", "smooth", SampleType.UInt16)]
    [InlineData("float32", "select", SampleType.Float32)]
    [InlineData("float64", "select", SampleType.Float64)]
    public void Output_type(string samples, string filter, SampleType expected)
    {
        using RunPlan plan = bench.Plan($"[[step]]\nfilter = \"{filter}\"\n[output]\nsamples = \"{samples}\"");

        Assert.Equal(expected, Assert.Single(plan.Kinds).Output);
    }

    [Fact]
    public void An_output_type_that_the_format_cannot_store_is_refused_with_the_reason()
    {
        bench.Sky.Refused = SampleType.Float64;

        Assert.Contains("r.toml:2:1: SKY cannot store float64 samples: it has no such samples; change [output] samples or format",
            bench.Refused("[output]\nsamples = \"float64\"").Message, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("", "select", true)]
    [InlineData("", "smooth", false)]
    [InlineData("mask = false", "select", false)]
    [InlineData("mask = true", "smooth", true)]
    public void Change_mask_comes_with_selective_steps_unless_the_recipe_says_otherwise(string key, string filter, bool expected)
    {
        using RunPlan plan = bench.Plan($"[[step]]\nfilter = \"{filter}\"\n[output]\n{key}");

        Assert.Equal(expected, plan.WriteMask);
    }

    [Fact]
    public void A_stack_without_frames_is_refused()
    {
        bench.Sky.Layouts.Clear();

        StackFormatException fault = Assert.Throws<StackFormatException>(() => bench.Plan(""));
        Assert.Contains("no science frame", fault.Message, StringComparison.Ordinal);
        Assert.Equal(1, bench.Sky.Closed);
    }

    [Fact]
    public void Mask_files_are_looked_for_and_measured_before_the_run()
    {
        Assert.Equal(66, Assert.Throws<InputMissingException>(() => bench.Plan("[input]\nmask = \"none.cell\"")).ExitCode);
        bench.Put("mask.cell", "cell");
        bench.Cell.Layouts[0] = bench.Cell.Layouts[0] with { Width = 63 };

        Assert.Contains("63 x 48", Assert.Throws<StackFormatException>(() => bench.Plan("[input]\nmask = \"mask.cell\"")).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Frames_in_flight_are_lowered_to_fit_the_memory()
    {
        bench.Sky.Layouts.AddRange(Enumerable.Repeat(bench.Sky.Layouts[0], 99));
        bench.Resources = new Resources(8, 1L << 40, "--memory");
        using RunPlan roomy = bench.Plan("[[step]]\nfilter = \"select\"");
        MemoryNeed need = roomy.Memory!;
        Assert.Equal(10, roomy.FramesInFlight);

        bench.Resources = new Resources(8, need.For(3), "--memory");
        using RunPlan tight = bench.Plan("[[step]]\nfilter = \"select\"");
        Assert.Equal(3, tight.FramesInFlight);

        bench.Resources = new Resources(8, need.For(3) - 1, "--memory");
        using RunPlan tighter = bench.Plan("[[step]]\nfilter = \"select\"");
        Assert.Equal(2, tighter.FramesInFlight);

        bench.Resources = new Resources(8, need.For(1) - 1, "--memory");
        UsageException fault = Assert.Throws<UsageException>(() => bench.Plan("[[step]]\nfilter = \"select\""));
        Assert.StartsWith("--memory: ", fault.Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Frames_in_flight_are_never_more_than_frames()
    {
        using RunPlan plan = bench.Plan("");

        Assert.Equal(1, plan.FramesInFlight);
    }
}
