using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Real files through reader and writer: nothing is lost.</summary>
public class PassThroughTests
{
    private static readonly FitsFormat Format = new();
    private static readonly string[] MadeAnew = ["DATE", "CHECKSUM", "DATASUM", "DATAMIN", "DATAMAX", "EXTEND"];

    public static TheoryData<string> Stacks =>
    [
        "astro/m13.fits", "astro/m13real.fits", "astro/gmos_multi.fits", "astro/scale.fits", "astro/blank.fits",
        "astro/checksum_ngc1316.fits", "astro/fixed-1890.fits", "astro/o4sp040b0_raw.fits", "cal/flat_005.fits", "bad/checksum_false.fits",
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

        // The one file with false checksums keeps them in its table, which is carried as it is.
        if (!name.Contains("false", StringComparison.Ordinal))
            Assert.All(after.CheckHealth(CancellationToken.None), finding => Assert.False(finding.IsProblem, finding.Text));
    }

    [NeedsTheory(Needs.RealDataNeed)]
    [MemberData(nameof(Stacks))]
    public void Every_card_comes_out_verbatim_and_in_order_and_all_data_to_the_byte(string name)
    {
        using TemporaryFolder folder = new();
        using (IStackReader source = Format.Open(RealData.File(name), new ReadOptions()))
            PassThrough.Run(source, Format, folder.File("out.fits"));
        List<(List<string> Cards, byte[] Data)> before = FitsBytes.Split(File.ReadAllBytes(RealData.File(name)));
        List<(List<string> Cards, byte[] Data)> after = FitsBytes.Split(File.ReadAllBytes(folder.File("out.fits")));
        Assert.Equal(before.Count + 1, after.Count);
        for (int i = 0; i < before.Count; i++)
        {
            Assert.Equal(before[i].Data, after[i].Data);
            List<string> expected = Kept(before[i].Cards);
            Assert.Equal(expected, Kept(after[i].Cards).Take(expected.Count));
        }
    }

    private static List<string> Kept(List<string> cards)
    {
        int count = cards.FindLastIndex(card => card.Trim().Length > 0) + 1;
        return cards.Take(count).Where(card => !MadeAnew.Contains(card[..8].TrimEnd())).ToList();
    }
}
