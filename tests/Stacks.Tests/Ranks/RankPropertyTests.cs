using FsCheck;
using FsCheck.Xunit;
using Stacks.Abstractions;
using Stacks.Filters.Ranks;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Ranks;

/// <summary>What holds for rank filters on any plane.</summary>
public class RankPropertyTests
{
    private static readonly RankFilter[] Filters =
        [new MinimumFilter(), new MaximumFilter(), new MedianFilter(), new PercentileFilter(), new MidpointFilter(), new AlphaTrimmedMeanFilter()];

    [Property(MaxTest = 60)]
    public void Constants_stay_constant(PositiveInt width, PositiveInt height, int seed)
    {
        double level = new Random(seed).NextDouble() * 1000;
        Plane<double> plane = FilterRun.PlaneOf(1 + (width.Get % 40), 1 + (height.Get % 40), (_, _) => level);
        foreach (RankFilter filter in Filters)
            Assert.All(Run(filter, plane, 5).Samples.ToArray(), v => Assert.Equal(level, v));
    }

    [Property(MaxTest = 60)]
    public void Flips_and_transposition_commute_to_the_bit(PositiveInt width, PositiveInt height, int seed)
    {
        RankScene<double> scene = new(1 + (width.Get % 40), 1 + (height.Get % 40), seed, missing: 0.05);
        foreach (RankFilter filter in Filters)
        {
            foreach (int side in new[] { 3, 7 })
            {
                Plane<double> straight = Run(filter, scene.Plane, side, scene.Flags);
                AssertSame(MirrorX(straight), Run(filter, MirrorX(scene.Plane), side, MirrorX(scene.Flags)));
                AssertSame(MirrorY(straight), Run(filter, MirrorY(scene.Plane), side, MirrorY(scene.Flags)));
                AssertSame(Transpose(straight), Run(filter, Transpose(scene.Plane), side, Transpose(scene.Flags)));
            }
        }
    }

    [Property(MaxTest = 60)]
    public void Results_lie_in_the_range_of_their_window(PositiveInt width, PositiveInt height, int seed)
    {
        RankScene<float> scene = new(1 + (width.Get % 40), 1 + (height.Get % 40), seed, missing: 0.2, saturated: 0.1);
        foreach (RankFilter filter in Filters)
        {
            Plane<float> result = Run(filter, scene.Plane, 5, scene.Flags);
            for (int y = 0; y < result.Height; y++)
            {
                for (int x = 0; x < result.Width; x++)
                {
                    List<float> window = scene.Sorted(x, y, 5);
                    if (scene.Flags[x, y] == 0)
                        Assert.InRange(result[x, y], window[0], window[^1]);
                }
            }
        }
    }

    [Property(MaxTest = 60)]
    public void Linear_changes_of_the_values_commute(PositiveInt width, PositiveInt height, int seed)
    {
        // Powers of two and whole numbers, so that a v + b is exact and any difference is the filter's.
        RankScene<short> whole = new(1 + (width.Get % 40), 1 + (height.Get % 40), seed);
        Random random = new(seed);
        double a = Math.Pow(2, random.Next(-3, 4)), b = random.Next(-5000, 5000);
        Plane<double> plane = FilterRun.PlaneOf(whole.Plane.Width, whole.Plane.Height, (x, y) => (double)whole.Plane[x, y]);
        Plane<double> changed = FilterRun.PlaneOf(plane.Width, plane.Height, (x, y) => (a * plane[x, y]) + b);
        foreach (RankFilter filter in Filters)
        {
            Plane<double> straight = Run(filter, plane, 5), other = Run(filter, changed, 5);
            for (int i = 0; i < straight.Length; i++)
                Assert.Equal((a * straight.Buffer[i]) + b, other.Buffer[i], 8);
        }
    }

    [Property(MaxTest = 30)]
    public void Bands_give_the_same_bits(PositiveInt width, PositiveInt height, int seed)
    {
        RankScene<float> scene = new(1 + (width.Get % 90), 1 + (height.Get % 40), seed, missing: 0.02, saturated: 0.02);
        foreach (RankFilter filter in Filters)
        {
            Plane<float> one = Run(filter, scene.Plane, 5, scene.Flags);
            AssertSame(one, Run(filter, scene.Plane, 5, scene.Flags, bands: 2));
            AssertSame(one, Run(filter, scene.Plane, 5, scene.Flags, bands: 5));
        }
    }

    private static Plane<T> Run<T>(RankFilter filter, Plane<T> plane, int side, Plane<SampleFlags>? flags = null, int bands = 1)
        where T : unmanaged
    {
        List<(string, ParameterValue)> given = [("window", ParameterValue.Of(side))];
        if (filter is PercentileFilter)
            given.Add(("percentile", ParameterValue.Of(33)));
        return FilterRun.Smooth(FilterRun.Prepare(filter, plane, [.. given]), plane, flags, bands: bands);
    }

    private static Plane<T> MirrorX<T>(Plane<T> p)
        where T : unmanaged => FilterRun.PlaneOf(p.Width, p.Height, (x, y) => p[p.Width - 1 - x, y]);

    private static Plane<T> MirrorY<T>(Plane<T> p)
        where T : unmanaged => FilterRun.PlaneOf(p.Width, p.Height, (x, y) => p[x, p.Height - 1 - y]);

    private static Plane<T> Transpose<T>(Plane<T> p)
        where T : unmanaged => FilterRun.PlaneOf(p.Height, p.Width, (x, y) => p[y, x]);

    private static void AssertSame<T>(Plane<T> expected, Plane<T> actual)
        where T : unmanaged
    {
        Assert.Equal(expected.Width, actual.Width);
        Assert.Equal(
            System.Runtime.InteropServices.MemoryMarshal.AsBytes(expected.Samples).ToArray(),
            System.Runtime.InteropServices.MemoryMarshal.AsBytes(actual.Samples).ToArray());
    }
}
