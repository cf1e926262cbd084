using System.Numerics;
using Stacks.Abstractions;
using Stacks.Filters.Ranks;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Ranks;

/// <summary>Each filter of the plugin against its textbook definition on sorted windows, with holes and saturation.</summary>
public class RankFilterTests
{
    private static readonly (int Width, int Height)[] Shapes = [(1, 1), (1, 2), (2, 1), (3, 3), (1, 40), (40, 1), (5, 9), (67, 12)];

    [Fact]
    public void Minimum_is_the_lowest_of_the_window() =>
        InAllTypes(new MinimumFilter(), s => s[0]);

    [Fact]
    public void Maximum_is_the_highest_of_the_window() =>
        InAllTypes(new MaximumFilter(), s => s[^1]);

    [Fact]
    public void Median_is_the_middle_of_the_window() =>
        InAllTypes(new MedianFilter(), s => s.Count % 2 == 1 ? s[s.Count / 2] : (s[(s.Count / 2) - 1] + s[s.Count / 2]) / 2);

    [Theory]
    [InlineData(0)]
    [InlineData(30)]
    [InlineData(62.5)]
    [InlineData(100)]
    public void Percentile_lies_on_the_line_between_ranks(double percent) => InFloats(
        new PercentileFilter(),
        s =>
        {
            double h = (s.Count - 1) * percent / 100;
            int j = (int)Math.Floor(h + 1e-9);
            return j + 1 < s.Count ? s[j] + ((h - j) * (s[j + 1] - s[j])) : s[j];
        },
        SampleFlags.Missing,
        ("percentile", ParameterValue.Of(percent)));

    [Fact]
    public void Midpoint_is_half_way_between_lowest_and_highest() =>
        InFloats(new MidpointFilter(), s => (s[0] + s[^1]) / 2, SampleFlags.Missing | SampleFlags.Saturated);

    [Theory]
    [InlineData(0)]
    [InlineData(0.25)]
    [InlineData(0.4)]
    [InlineData(1)]
    public void Alpha_trimmed_mean_averages_what_is_left(double trim) => InFloats(
        new AlphaTrimmedMeanFilter(),
        s =>
        {
            int half = Math.Min((int)decimal.Floor((decimal)trim * s.Count / 2), (s.Count - 1) / 2);
            return s.Skip(half).SkipLast(half).Average();
        },
        SampleFlags.Missing | SampleFlags.Saturated,
        ("trim", ParameterValue.Of(trim)));

    [Fact]
    public void Alpha_trimmed_mean_of_the_textbook_window()
    {
        // 3 x 3 around the centre: 1 2 3 4 5 6 7 8 100, d = 2 leaves 2..8: mean 5; d = 8 leaves the median.
        double[] window = [1, 2, 3, 4, 100, 5, 6, 7, 8];
        Plane<double> plane = FilterRun.PlaneOf(3, 3, (x, y) => window[(y * 3) + x]);
        AlphaTrimmedMeanFilter filter = new();
        Assert.Equal(5, FilterRun.Smooth(FilterRun.Prepare(filter, plane, ("trim", ParameterValue.Of(2.0 / 9))), plane)[1, 1]);
        Assert.Equal(5, FilterRun.Smooth(FilterRun.Prepare(filter, plane, ("trim", ParameterValue.Of(1))), plane)[1, 1]);
        Assert.Equal(136.0 / 9, FilterRun.Smooth(FilterRun.Prepare(filter, plane, ("trim", ParameterValue.Of(0))), plane)[1, 1], 13);
    }

    [Fact]
    public void Windows_must_be_odd_and_from_3_to_31()
    {
        Plane<ushort> plane = FilterRun.PlaneOf(4, 4, (_, _) => (ushort)1);
        foreach (double side in new[] { 1, 2, 4, 33, 3.5 })
            Assert.Throws<ParameterException>(() => FilterRun.Prepare(new MedianFilter(), plane, ("window", ParameterValue.Of(side))));
    }

    [Fact]
    public void The_largest_window_runs_in_every_filter()
    {
        RankFilter[] filters = [new MinimumFilter(), new MedianFilter(), new MaximumFilter(), new MidpointFilter(), new AlphaTrimmedMeanFilter()];
        RankScene<double> scene = new(33, 5, 3, missing: 0.01);
        foreach (RankFilter filter in filters)
        {
            Plane<double> result = FilterRun.Smooth(FilterRun.Prepare(filter, scene.Plane, ("window", ParameterValue.Of(31))), scene.Plane, scene.Flags);
            for (int x = 0; x < 33; x++)
            {
                List<double> sorted = scene.Sorted(x, 2, 31);
                if (scene.Flags[x, 2] == 0)
                    Assert.InRange(result[x, 2], sorted[0], sorted[^1]);
            }
        }
    }

    private static void InAllTypes(IFilterPlugin filter, Func<List<double>, double> definition)
    {
        Assert.Equal(4, filter.WorkTypes.Count);
        Check<ushort>(filter, definition, SampleFlags.Missing);
        Check<short>(filter, definition, SampleFlags.Missing);
        Check<float>(filter, definition, SampleFlags.Missing);
        Check<double>(filter, definition, SampleFlags.Missing);
    }

    private static void InFloats(
        IFilterPlugin filter, Func<List<double>, double> definition, SampleFlags without, params (string Name, ParameterValue Value)[] given)
    {
        Assert.Equal([WorkType.Float32, WorkType.Float64], filter.WorkTypes);
        Check<float>(filter, definition, without, given);
        Check<double>(filter, definition, without, given);
    }

    private static void Check<T>(
        IFilterPlugin filter, Func<List<double>, double> definition, SampleFlags without, params (string Name, ParameterValue Value)[] given)
        where T : unmanaged, INumber<T>
    {
        bool isInteger = T.One / (T.One + T.One) == T.Zero;
        foreach (int side in new[] { 3, 5, 7, 11, 15 })
        {
            foreach ((int width, int height) in Shapes)
            {
                foreach ((double missing, double saturated) in new[] { (0.0, 0.0), (0.1, 0.05), (0.85, 0.1) })
                {
                    RankScene<T> scene = new(width, height, (side * 31) + (width * 7) + height, missing, saturated);
                    IFilterStep<T> step = FilterRun.Prepare(filter, scene.Plane, [("window", ParameterValue.Of(side)), .. given]);
                    Plane<T> result = FilterRun.Smooth(step, scene.Plane, scene.Flags);
                    for (int y = 0; y < height; y++)
                    {
                        for (int x = 0; x < width; x++)
                        {
                            List<double> sorted = [.. scene.Sorted(x, y, side, without).Select(double.CreateChecked)];
                            if (scene.Flags[x, y] != 0 || sorted.Count < 3)
                            {
                                Assert.Equal(scene.Plane[x, y], result[x, y]);
                                continue;
                            }

                            double expected = definition(sorted), actual = double.CreateChecked(result[x, y]);
                            if (isInteger)
                                Assert.Equal(Math.Round(expected, MidpointRounding.ToEven), actual);
                            else
                                Assert.InRange(actual - expected, -Tolerance<T>(sorted), Tolerance<T>(sorted));
                        }
                    }
                }
            }
        }
    }

    private static double Tolerance<T>(List<double> sorted) =>
        (typeof(T) == typeof(float) ? 1e-7 : 1e-14) * Math.Max(Math.Abs(sorted[0]), Math.Abs(sorted[^1]));
}
