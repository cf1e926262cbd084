using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.Pipeline;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

/// <summary>Steps and noise by channel, on OME-TIFF stacks of several channels, through a whole run.</summary>
public sealed class ChannelTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    [Theory]
    [InlineData("1")]
    [InlineData("\"cytoplasm\"")]
    public void A_step_changes_the_frames_of_its_channel_alone_with_that_channels_noise(string channel)
    {
        string recipe = $"""
            [[noise]]
            channel = "nuclei"
            from = "values"
            sigma = 3
            [[noise]]
            channel = 1
            from = "values"
            sigma = 4
            [[step]]
            filter = "adaptive-median"
            channel = {channel}
            threshold = 6
            psf_fwhm = 3
            """;
        Check(Path.Combine(Checkout.Root, "sample-stacks", "wandering-cells.ome.tif"), recipe, 1, "sigma 4 ADU");
    }

    [NeedsFact(Needs.RealDataNeed)]
    public void A_real_z_series_of_three_channels() =>
        Check(RealData.File("micro", "multi-channel-z-series.ome.tif"), "[noise]\nfrom = \"frame\"\n[[step]]\nfilter = \"median\"\nchannel = 2\n[output]\nsamples = \"same\"\n", 2, "");

    private void Check(string source, string recipe, int channel, string noise)
    {
        RunResult result = HostRun.Of(recipe, source, folder.File("result.ome.tif"));
        using IStackReader before = new TiffFormat().Open(source, new ReadOptions()), after = new TiffFormat().Open(folder.File("result.ome.tif"), new ReadOptions());
        int changed = 0;
        for (int frame = 0; frame < before.FrameCount; frame++)
        {
            bool isChanged = !PassThrough.Stored(before, frame).AsSpan().SequenceEqual(PassThrough.Stored(after, frame));
            Assert.True(!isChanged || before.Layout(frame).Channel == channel, $"frame {frame} of channel {before.Layout(frame).Channel}");
            changed += isChanged ? 1 : 0;
            Assert.Equal((before.Layout(frame).Channel, before.Layout(frame).ChannelName), (after.Layout(frame).Channel, after.Layout(frame).ChannelName));
        }

        Assert.Equal(Enumerable.Range(0, before.FrameCount).Count(f => before.Layout(f).Channel == channel), changed);
        Assert.Contains(result.Provenance!.Noise, line => line.Contains(noise, StringComparison.Ordinal));
    }
}
