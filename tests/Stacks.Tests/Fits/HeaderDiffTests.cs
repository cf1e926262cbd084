using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>
/// Headers of input and output card for card, all 80 characters, found in the bytes by the standard's rules alone: they may
/// differ in the declared list and nowhere else.
/// </summary>
public sealed class HeaderDiffTests : IDisposable
{
    private const string AdaptiveMedian = "[noise]\nfrom = \"frame\"\n[[step]]\nfilter = \"adaptive-median\"\npsf_fwhm = 2\n";
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    public static TheoryData<string, bool> Recipes => new() { { "", false }, { AdaptiveMedian, false }, { "[output]\nsamples = \"float32\"\n", true } };

    [NeedsTheory(Needs.RealDataNeed)]
    [MemberData(nameof(Recipes))]
    public void Every_real_file(string recipe, bool isOtherType)
    {
        string[] files = [.. Directory.GetFiles(RealData.File("astro"), "*.fits"), .. Directory.GetFiles(RealData.File("cal"), "*.fits"), .. Directory.GetFiles(Path.Combine(Checkout.Root, "sample-stacks"), "*.fits")];
        int compared = 0;
        foreach (string file in files.Order(StringComparer.Ordinal))
        {
            byte[] source = File.ReadAllBytes(file);

            // Of a compressed image the table's header stands in the file, and the image's own is compared in FitsTiles.
            if (FitsBytes.Split(source).Any(hdu => hdu.Cards.Any(card => card.StartsWith("ZIMAGE", StringComparison.Ordinal))) || Path.GetFileName(file) == "random_groups.fits")
                continue;
            compared += Compare(Path.GetFileName(file), source, Run(file, recipe), isOtherType);
        }

        Assert.True(compared >= 20, $"only {compared} headers were compared");
    }

    [Theory]
    [MemberData(nameof(Recipes))]
    public void Odd_but_legal_cards(string recipe, bool isOtherType)
    {
        string[] odd =
        [
            "OBJECT  = 'NGC ''1''  &'       / a quote in quotes", "CONTINUE  ' goes on &'  / and on", "CONTINUE  'to its end'", "LONGSTRN= 'OGIP 1.0'",
            "EXPTIME =1.5e+01 / free format, small exponent", "EXPTIME = 1.50D1", "GAIN    =                     ", "UNDEFVAL=", "LOGICAL =                    F",
            "COMPLEX = (1.0, -2.5)", "HIERARCH ESO DET CHIP1 ID = 'x' / long", "HIERARCH  Odd Spacing =   7", "COMMENT one", "COMMENT", "COMMENT one", "HISTORY made by hand",
            "", "        a comment without a keyword", "REPEATED= 1", "REPEATED=                    2", "lower   =                    3", "NOEQUALS is no value", "WITH_TAB= 'a b'    /", "DATE-OBS= '2001-02-03T04:05:06.789'",
            "CRPIX1  =  -1.0000000000000001E-300", "EQUINOX = 2000.  /comment right here", "/ = no keyword at all", "KEY-_19 = 'A-Z, 0-9, - and _'", "DATAMIN =                    0", "INHERIT =                    F",
        ];
        byte[] source = new FitsBytes()
            .Primary(16, [6, 5], FitsBytes.Shorts([.. Enumerable.Range(0, 30)]), odd)
            .Image(16, [6, 5], FitsBytes.Shorts([.. Enumerable.Range(100, 30)]), [.. odd, "BLANK   =                  117", "BSCALE  =                  1.0"])
            .Hdu([FitsBytes.Text("XTENSION", "DUMP"), FitsBytes.Card("BITPIX", 8), FitsBytes.Card("NAXIS", 0), FitsBytes.Card("PCOUNT", 0), FitsBytes.Card("GCOUNT", 1), .. odd, "CHECKSUM= '0000000000000000'"], [])
            .ToArray();
        string path = folder.File("odd.fits");
        File.WriteAllBytes(path, source);

        Assert.Equal(3, Compare("odd.fits", source, Run(path, recipe), isOtherType));
    }

    private byte[] Run(string file, string recipe)
    {
        HostRun.Of(recipe, file, folder.File("out.fits"));
        return File.ReadAllBytes(folder.File("out.fits"));
    }

    /// <summary>The number of headers compared.</summary>
    private static int Compare(string name, byte[] source, byte[] result, bool isOtherType)
    {
        List<(List<string> Cards, byte[] Data)> before = FitsBytes.Split(source), after = FitsBytes.Split(result);
        Assert.True(after.Count > before.Count, name);
        for (int i = 0; i < before.Count; i++)
        {
            // BLANK, BZERO and the others stay where the sample type does; nothing is missing of a whole file.
            CardChange[] excused = [.. CardChanges.Declared.Except([CardChanges.Axes, CardChanges.Filling, CardChanges.History]).Where(c => c != CardChanges.Scaling || isOtherType)];
            List<string> Kept(List<string> cards)
            {
                List<string> kept = [];
                bool isExcused = false;
                foreach (string card in cards)
                {
                    if (!(isExcused && card.StartsWith("CONTINUE", StringComparison.Ordinal)))
                        isExcused = excused.Any(c => c.Keywords.Contains(card[..8].TrimEnd()) && (c.When.Contains("frames", StringComparison.Ordinal) || i == 0));
                    if (!isExcused)
                        kept.Add(card);
                }

                return kept;
            }

            List<string> expected = Kept(before[i].Cards), actual = Kept(after[i].Cards);
            while (expected is [.., var last] && last.Trim().Length == 0)
                expected.RemoveAt(expected.Count - 1);
            while (actual is [.., var last] && last.Trim().Length == 0)
                actual.RemoveAt(actual.Count - 1);
            if (i == 0)
            {
                // What this run adds to HISTORY stands behind all that was there.
                Assert.All(actual.Skip(expected.Count), card => Assert.StartsWith("HISTORY", card, StringComparison.Ordinal));
                actual = [.. actual.Take(expected.Count)];
            }

            Assert.True(expected.SequenceEqual(actual), $"{name}, HDU {i}:\n{string.Join('\n', expected.Except(actual).Select(c => "- " + c))}\n{string.Join('\n', actual.Except(expected).Select(c => "+ " + c))}");
        }

        return before.Count;
    }
}
