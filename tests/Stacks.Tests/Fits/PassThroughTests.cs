using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

public class PassThroughTests
{
    private static readonly FitsFormat Format = new();

    public static TheoryData<string> Stacks =>
    [
        "astro/m13.fits", "astro/m13real.fits", "astro/gmos_multi.fits", "astro/scale.fits", "astro/blank.fits",
        "astro/checksum_ngc1316.fits", "astro/fixed-1890.fits", "astro/o4sp040b0_raw.fits", "cal/flat_005.fits",
    ];

    [NeedsTheory(Needs.RealDataNeed)]
    [MemberData(nameof(Stacks))]
    public void Samples_and_layouts_come_out_as_they_went_in(string name)
    {
        using TemporaryFolder folder = new();
        using IStackReader before = Format.Open(RealData.File(name), new ReadOptions());
        PassThrough.Run(before, Format, folder.File("out.fits"), mask: true);
        using IStackReader after = Format.Open(folder.File("out.fits"), new ReadOptions());
        Assert.Equal(before.FrameCount, after.FrameCount);
        for (int frame = 0; frame < before.FrameCount; frame++)
        {
            Assert.Equal(before.Layout(frame), after.Layout(frame));
            Assert.Equal(PassThrough.Stored(before, frame), PassThrough.Stored(after, frame));
        }

        Assert.All(after.CheckHealth(CancellationToken.None), finding => Assert.False(finding.IsProblem, finding.Text));
    }
}
