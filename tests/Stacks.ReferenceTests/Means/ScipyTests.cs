using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Filters.Means;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Means;

/// <summary>Arithmetic, weighted and Gaussian means against scipy.ndimage, borders included: its mode 'mirror' is dcb|abcd|cba.</summary>
public class ScipyTests
{
    [NeedsFact(Needs.Scipy)]
    public void Scipy_ndimage_has_the_same_means()
    {
        using TemporaryFolder folder = new();
        Random random = new(5);
        Plane<double> input = FilterRun.PlaneOf(61, 47, (_, _) => 100 + (900 * random.NextDouble()));
        double[] weights = [1, 2, 3, 4, 50, 6, 7, 8, 9];
        Save("input", input);
        Save("arithmetic", FilterRun.Smooth(FilterRun.Prepare(new ArithmeticMeanFilter(), input, ("window", ParameterValue.Of(7))), input));
        Save("weighted", FilterRun.Smooth(FilterRun.Prepare(new WeightedMeanFilter(), input, ("weights", ParameterValue.Of(weights))), input));
        Save("gaussian", FilterRun.Smooth(FilterRun.Prepare(new GaussianFilter(), input, ("sigma", ParameterValue.Of(1.3))), input));

        ToolResult result = Tool.Run(
            Tool.Python,
            "-c",
            """
            import sys, numpy as np
            from scipy import ndimage as n
            read = lambda name: np.fromfile(f'{sys.argv[1]}/{name}', '<f8').reshape(47, 61)
            a = read('input')
            w = np.array([1, 2, 3, 4, 50, 6, 7, 8, 9.0]).reshape(3, 3)
            near = lambda name, b, tolerance: print(name, np.abs(read(name) - b).max()) or np.testing.assert_allclose(read(name), b, rtol=tolerance)
            near('arithmetic', n.uniform_filter(a, 7, mode='mirror'), 1e-12)
            near('weighted', n.correlate(a, w / w.sum(), mode='mirror'), 1e-12)
            near('gaussian', n.gaussian_filter(a, 1.3, mode='mirror', truncate=10), 2e-3)
            """,
            folder.Path);
        Assert.True(result.ExitCode == 0, result.Error + result.Output);

        void Save(string name, Plane<double> plane) => File.WriteAllBytes(folder.File(name), MemoryMarshal.AsBytes(plane.Samples).ToArray());
    }
}
