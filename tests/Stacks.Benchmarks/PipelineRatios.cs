using Stacks.Abstractions;
using Stacks.Filters.Bilateral;
using Stacks.Formats.Fits;
using Stacks.TestSupport;

namespace Stacks.Benchmarks;

/// <summary>
/// Whole runs from file to file, plan to rename, of an uncompressed 16-bit FITS cube on a warm page cache. A run takes these
/// digests: SHA-256 of source file, source frames, result frames (where a step changed them) and result file; DATASUM of the
/// source (checked) and of the result.
/// </summary>
internal static class PipelineRatios
{
    private const int FewFrames = 6;

    private const string Noise = "[noise]\nfrom = \"values\"\ngain = 10\nread_noise = 44.7\npedestal = 200\n";

    private const string Impulses = Noise + "[[step]]\nfilter = \"adaptive-median\"\nlargest_window = 7\npsf_fwhm = 2.4\n";

    private const string Bilateral = Noise + "[[step]]\nfilter = \"bilateral\"\nspatial_sigma = 3.0\nrange_sigma = 2.5\nconserve_flux = false\n";

    /// <summary>Frames of the cube; STACKS_CUBE=100 makes it 840 MB.</summary>
    private static int CubeFrames { get; } = int.TryParse(Environment.GetEnvironmentVariable("STACKS_CUBE"), out int frames) ? frames : 20;

    /// <summary>The rows.</summary>
    public static IEnumerable<Ratio> Of(Scene scene)
    {
        string cube = scene.File("cube.fits"), copy = scene.File("copy.fits"), result = scene.File("result.fits");
        FormatRatios.Write(new FitsFormat(), scene.Stack(CubeFrames), cube, OutputCompression.None, 1);
        void Run(string recipe, string source = "", int workers = 2)
        {
            File.Delete(result); // a result that is there already would be found done
            HostRun.Of(recipe, source.Length > 0 ? source : cube, result, workers);
        }

        Action Bare(BareDigests digests) => new BareCopy(cube, copy, CubeFrames, digests).Run;

        Ratio plain = Ratio.Of(
            "run without steps, 2 workers, to a bare copy by two threads with the same digests (both files, source frames, two DATASUMs) and fsync",
            0.9, () => Run(""), Bare(BareDigests.Files));
        yield return plain;
        yield return Beside("a bare copy by two threads with digests of source and result frames, two DATASUMs and fsync", Bare(BareDigests.ResultFrames));
        yield return Beside("File.Copy, not synced", () => File.Copy(cube, copy, true));
        yield return Beside("cp and sync", () => Tool.Run("sh", "-c", $"cp {cube} {copy} && sync {copy}"));
        Ratio Beside(string reference, Action copying) => new("run without steps, 2 workers, shown beside " + reference, plain.Ours, Ratio.TimeOf(copying), default);

        yield return Ratio.Of(
            "run with adaptive-median, largest window 7, 2 workers, to a bare copy by two threads with the same digests (both files, source and result frames, two DATASUMs) and fsync",
            0.6, () => Run(Impulses), Bare(BareDigests.ResultFrames | BareDigests.Files));
        string few = scene.File("few.fits");
        FormatRatios.Write(new FitsFormat(), scene.Stack(FewFrames), few, OutputCompression.None, 1);
        Action[] kernels = [.. Enumerable.Range(0, 2).Select(i => Filtering.Of(new BilateralFilter(), scene.Plane<float>(i), null, 1,
            ("spatial_sigma", ParameterValue.Of(3.0)), ("range_sigma", ParameterValue.Of(2.5)), ("conserve_flux", ParameterValue.Of(false))))];
        Ratio filtered = Ratio.Of(
            "run with bilateral, spatial sigma 3, 2 workers, to the filter alone on two threads", Goal.AtMost(1.1), () => Run(Bilateral, few),
            () => Parallel.For(0, 2, i =>
            {
                for (int frame = 0; frame < FewFrames; frame += 2)
                    kernels[i]();
            }));
        yield return filtered;
        yield return new Ratio("run with bilateral, spatial sigma 3, 2 workers, to 1 worker", filtered.Ours, Ratio.TimeOf(() => Run(Bilateral, few, 1)), 1.85);
    }
}
