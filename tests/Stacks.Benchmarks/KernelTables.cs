using BenchmarkDotNet.Attributes;
using Stacks.Abstractions;
using Stacks.Filters.AdaptiveMedian;
using Stacks.Filters.LocalStatistics;
using Stacks.Filters.Means;
using Stacks.Filters.Ranks;

namespace Stacks.Benchmarks;

/// <summary>Times of kernels by side of the window, 2048 x 2048 samples, one thread.</summary>
public class KernelTables
{
    private Action work = () => { };

    /// <summary>Filter and sample type.</summary>
    [Params("median u16", "median f32", "adaptive-median u16", "local-statistics f32", "arithmetic-mean f32")]
    public string Kernel { get; set; } = "";

    /// <summary>Side of the window, or the largest one.</summary>
    [Params(3, 7, 15)]
    public int Window { get; set; }

    [GlobalSetup]
    public void Prepare()
    {
        using Scene scene = new();
        (string, ParameterValue) window = ("window", ParameterValue.Of(Window));
        work = Kernel switch
        {
            "median u16" => Filtering.Of(new MedianFilter(), scene.Plane<ushort>(), null, 1, window),
            "median f32" => Filtering.Of(new MedianFilter(), scene.Plane<float>(), null, 1, window),
            "adaptive-median u16" => Filtering.Of(
                new AdaptiveMedianFilter(), scene.Plane<ushort>(), null, 1, ("largest_window", ParameterValue.Of(Window)), ("psf_fwhm", ParameterValue.Of(2.4))),
            "local-statistics f32" => Filtering.Of(new LocalStatisticsFilter(), scene.Plane<float>(), null, 1, window),
            _ => Filtering.Of(new ArithmeticMeanFilter(), scene.Plane<float>(), null, 1, window),
        };
    }

    [Benchmark]
    public void Frame() => work();
}
