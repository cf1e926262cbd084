using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Bilateral;

/// <summary>Which form filters a frame, and what the record says of it.</summary>
public class FastBilateralChoiceTests
{
    private static IFilterStep<double> Prepare(string method, double spatial, double range = 2.5) => FilterRun.Prepare(
        new BilateralFilter(),
        FilterRun.PlaneOf(60, 50, (x, y) => (double)x),
        ("spatial_sigma", ParameterValue.Of(spatial)),
        ("range_sigma", ParameterValue.Of(range)),
        ("method", ParameterValue.Of(method)));

    [Theory]
    [InlineData("auto", 1.5, "exact")]
    [InlineData("auto", 5.9, "exact")]
    [InlineData("auto", 6, "fast")]
    [InlineData("exact", 58, "exact")]
    [InlineData("fast", 58, "fast")]
    public void The_record_says_which_form_was_prepared(string method, double spatial, string used)
    {
        IFilterStep<double> step = Prepare(method, spatial);
        Assert.Equal(used, step.Resolved.Single(r => r.Name == "method").Value);
        Assert.Equal(used == "fast", step is FastBilateralStep<double>);
    }

    [Fact]
    public void Fast_is_refused_below_its_least_spatial_sigma()
    {
        ParameterException error = Assert.Throws<ParameterException>(() => Prepare("fast", 3));
        Assert.Contains("method", error.Message, StringComparison.Ordinal);
        Assert.Contains("6", error.Message, StringComparison.Ordinal);
    }

    /// <summary>At a spatial sigma of 6 the grid has a quarter of the frame's samples as nodes, each of 48 slots and two floats.</summary>
    [Theory]
    [InlineData(3000, true)]
    [InlineData(8000, false)]
    public void Frames_whose_grid_would_not_fit_are_left_to_the_exact_form(int side, bool fits)
    {
        FrameLayout layout = new() { Width = side, Height = side, SampleType = SampleType.Float32 };
        BilateralFilter filter = new();
        IFilterStep Step(string method) => filter.Prepare(
            layout, WorkType.Float32, new ParameterValues(filter.Parameters, new Dictionary<string, ParameterValue> { ["spatial_sigma"] = ParameterValue.Of(6), ["method"] = ParameterValue.Of(method) }));
        Assert.Equal(fits, Step("auto") is FastBilateralStep<float>);
        if (!fits)
            Assert.Contains("1 GB", Assert.Throws<ParameterException>(() => Step("fast")).Message, StringComparison.Ordinal);
    }

    /// <summary>T of 1e9 range sigmas has more levels than the fast form holds.</summary>
    [Fact]
    public void A_frame_of_too_many_levels_is_filtered_exactly_and_the_record_says_so()
    {
        Plane<double> plane = FilterRun.PlaneOf(30, 20, (x, y) => x == 7 && y == 9 ? 1e9 : x + y);
        Dictionary<string, double> reported = [];
        LinearNoise noise = LinearNoise.Constant(1);
        Plane<double> fast = FilterRun.Smooth(
            FilterRun.Prepare(
                new BilateralFilter(), plane, ("spatial_sigma", ParameterValue.Of(6)), ("conserve_flux", ParameterValue.Of(false)), ("method", ParameterValue.Of("fast"))),
            plane,
            noise: noise,
            report: (name, value) => reported[name] = value);
        Plane<double> exact = FilterRun.Smooth(
            FilterRun.Prepare(
                new BilateralFilter(), plane, ("spatial_sigma", ParameterValue.Of(6)), ("conserve_flux", ParameterValue.Of(false)), ("method", ParameterValue.Of("exact"))),
            plane,
            noise: noise);
        Assert.Equal(0, reported["fast"]);
        Assert.Equal(exact.Samples.ToArray(), fast.Samples.ToArray());
    }

    /// <summary>Samples spread evenly over thousands of levels would each need a grid of its own; on a few levels they do not.</summary>
    [Theory]
    [InlineData("auto", 20, 1)]
    [InlineData("auto", 2000, 0)]
    [InlineData("fast", 2000, 1)]
    public void Auto_leaves_frames_on_many_levels_to_the_exact_form(string method, double span, double fast)
    {
        Plane<double> plane = FilterRun.PlaneOf(400, 300, (x, y) => span * ((y * 400) + x) / 120_000);
        Dictionary<string, double> reported = [];
        FilterRun.Smooth(
            FilterRun.Prepare(
                new BilateralFilter(), plane, ("spatial_sigma", ParameterValue.Of(8)), ("range_sigma", ParameterValue.Of(1)), ("conserve_flux", ParameterValue.Of(false)), ("method", ParameterValue.Of(method))),
            plane,
            noise: LinearNoise.Constant(1),
            report: (name, value) => reported[name] = value);
        Assert.Equal(fast, reported["fast"]);
    }

    /// <summary>The two forms measure the same mean gradient, and a frame without any stays as it is.</summary>
    [Fact]
    public void A_range_of_the_mean_gradient_serves_both_forms()
    {
        FastScene scene = new(80, 70, 21, 500, missing: 0.05);
        Plane<double> flat = FilterRun.PlaneOf(80, 70, (_, _) => 7.0);
        foreach (string method in new[] { "fast", "exact" })
        {
            IFilterStep<double> step = FilterRun.Prepare(
                new BilateralFilter(), scene.Plane, ("spatial_sigma", ParameterValue.Of(6)), ("range_sigma", ParameterValue.Of("mean-gradient")), ("method", ParameterValue.Of(method)));
            double range = 0;
            FilterRun.Smooth(step, scene.Plane, scene.Flags, LinearNoise.Constant(10), report: (name, value) => range = name == "range_sigma" ? value : range);
            Assert.Equal(MeanGradientOf(scene), range, 1e-9);
            Assert.Equal(flat.Samples.ToArray(), FilterRun.Smooth(step, flat, noise: LinearNoise.Constant(10)).Samples.ToArray());
        }
    }

    private static double MeanGradientOf(FastScene scene)
    {
        List<double> magnitudes = [];
        for (int y = 1; y < scene.Plane.Height - 1; y++)
        {
            for (int x = 1; x < scene.Plane.Width - 1; x++)
            {
                double alongX = (scene.Plane[x + 1, y] - scene.Plane[x - 1, y]) / 20, alongY = (scene.Plane[x, y + 1] - scene.Plane[x, y - 1]) / 20;
                if (double.IsFinite(alongX + alongY))
                    magnitudes.Add(Math.Sqrt((alongX * alongX) + (alongY * alongY)));
            }
        }

        return magnitudes.Average();
    }
}
