using System.Globalization;
using System.Text.Json;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Inspection;

/// <summary>What <c>inspect</c> says of real stacks, against numpy over the samples that an independent reader gives.</summary>
public class InspectReferenceTests
{
    private const string Figures = """
        import sys, numpy
        path = sys.argv[1]
        if path.endswith('.fits'):
            from astropy.io import fits
            image = fits.open(path, do_not_scale_image_data=True)[0]  # which would scale in single precision
            stack = image.header.get('BZERO', 0) + image.header.get('BSCALE', 1) * image.data.astype('f8')
        else:
            import tifffile
            stack = tifffile.imread(path)
        stack = stack.reshape(-1, *stack.shape[-2:]).astype('f8')
        for frame in stack:
            good = frame[numpy.isfinite(frame)]
            print(repr(float(good.min())), repr(float(numpy.median(good))), repr(float(good.max())), frame.size - good.size)
        """;

    [NeedsTheory(Needs.RealDataNeed, Needs.Tifffile, Needs.Astropy)]
    [InlineData("micro", "cancer_cell_migration_crop.tif")]
    [InlineData("micro", "BBBC022_IXMtest_A02_s9.tif")]
    [InlineData("micro", "multi-channel-z-series.ome.tif")]
    [InlineData("astro", "m13.fits")]
    [InlineData("astro", "m13real.fits")]
    [InlineData("astro", "scale.fits")]
    [InlineData("astro", "checksum_ngc1316.fits")]
    public void Lowest_median_and_highest_values_are_numpys(string folder, string name)
    {
        string path = RealData.File(folder, name);
        string[] lines = Tool.Run(Tool.Python, "-c", Figures, path).Output.TrimEnd('\n').Split('\n');

        ToolResult result = Tool.Stacks("inspect", "--json", path);

        Assert.Equal(0, result.ExitCode);
        using JsonDocument document = JsonDocument.Parse(result.Output);
        JsonElement stack = document.RootElement.GetProperty("stacks")[0];
        Assert.Equal(lines.Length, stack.GetProperty("frames").GetInt32());
        foreach (JsonElement frame in stack.GetProperty("figures").EnumerateArray())
        {
            double[] expected = [.. lines[frame.GetProperty("frame").GetInt32()].Split(' ').Select(n => double.Parse(n, CultureInfo.InvariantCulture))];
            double[] found = [.. new[] { "minimum", "median", "maximum", "missing" }.Select(k => frame.GetProperty(k).GetDouble())];
            Assert.All(expected.Zip(found), pair => Assert.Equal(pair.First, pair.Second, Math.Abs(pair.First) * 1e-12));
        }
    }
}
