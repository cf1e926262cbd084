using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.FitsTiles;

/// <summary>
/// Images in compressed tiles that others wrote, against the images before they were compressed: real ones, and those that
/// fpack and astropy make. What is compared last is the whole output file, so that headers are compared card for card.
/// </summary>
public class TileReferenceTests
{
    private const string Fpack = "fpack";
    private const string Funpack = "funpack";

    [NeedsTheory(Needs.RealDataNeed)]
    [InlineData("m13_rice.fits")]
    [InlineData("m13_gzip.fits")]
    [InlineData("m13_plio.fits")]
    [InlineData("m13_hcomp.fits")]
    public void A_compressed_field_gives_the_same_file_as_the_plain_one(string name)
    {
        using TemporaryFolder folder = new();
        AssertSameFiles(folder, RealData.File("astro", "m13.fits"), RealData.File("astro", name));
    }

    [NeedsFact(Needs.RealDataNeed, Needs.Astropy, Funpack)]
    public void A_quantised_field_has_the_values_of_other_readers()
    {
        using TemporaryFolder folder = new();
        string name = RealData.File("astro", "m13real_rice.fits");
        Outside.Run(Funpack, "-O", folder.File("plain.fits"), name);
        Outside.AssertSameFrames(folder.File("plain.fits"), name);
        Outside.AssertAstropyAgrees(folder, name);
    }

    /// <summary>Type, and the options of fpack that keep it to the bit.</summary>
    public static TheoryData<string, string> Packed
    {
        get
        {
            TheoryData<string, string> data = [];
            foreach (string type in (string[])["u1", "i2", "u2", "i4", "u4"])
            {
                foreach (string options in (string[])["-r", "-g1", "-g2", "-h", "-r -w", "-h -t 20,16", "-g2 -t 5,3,2", "-r -t 40,40,3"])
                    data.Add(type, options);
            }

            foreach (string type in (string[])["f4", "f8"])
            {
                foreach (string options in (string[])["-g1 -q 0", "-g2 -q 0", "-g2 -q 0 -t 5,3,2"])
                    data.Add(type, options);
            }

            return data;
        }
    }

    [NeedsTheory(Needs.Astropy, Fpack)]
    [MemberData(nameof(Packed))]
    public void What_fpack_makes_of_our_output_reads_back_identical(string type, string options)
    {
        using TemporaryFolder folder = new();
        // fpack itself makes NaN of infinities and 0 of -0.
        Outside.Python(Samples.MakeFile, type, folder.File("in.fits"), "finite");
        Outside.Pass(folder.File("in.fits"), folder.File("ours.fits"));
        Outside.Run(Fpack, [.. options.Split(' '), "-O", folder.File("ours.fz"), folder.File("ours.fits")]);
        Outside.AssertSameFrames(folder.File("ours.fits"), folder.File("ours.fz"));
    }

    [NeedsFact(Needs.Astropy)]
    public void What_astropy_compresses_is_read_as_astropy_reads_it()
    {
        using TemporaryFolder folder = new();
        Directory.CreateDirectory(folder.File("made"));
        Outside.Python(Samples.MakeCompressed, folder.File("made"));
        Outside.AssertAstropyAgrees(folder, Directory.GetFiles(folder.File("made")));
    }

    /// <summary>Passes both through, under one name, and compares all bytes of the results.</summary>
    private static void AssertSameFiles(TemporaryFolder folder, string plain, string packed)
    {
        byte[] Result(string from)
        {
            File.Copy(from, folder.File("in.fits"), overwrite: true);
            Outside.Pass(folder.File("in.fits"), folder.File("out.fits"));
            return File.ReadAllBytes(folder.File("out.fits"));
        }

        Assert.True(Result(plain).AsSpan().SequenceEqual(Result(packed)));
    }
}
