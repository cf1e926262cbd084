using Stacks.Abstractions;
using Stacks.Formats.Fits;
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

    /// <summary>
    /// Quantised as fpack does it, without dithering, with it, and with zeros kept; seeds reach over the end of the sequence
    /// of random numbers. Every sample is within half of a step of what it was, which only the right random number gives;
    /// missing samples are where they were; and the bits are those of astropy and funpack, except where one of them is
    /// wrong by the first rule: astropy 5.2.1 misses NaN by a ZBLANK keyword, funpack (cfitsio 4.2.0) tiles narrower than the image.
    /// </summary>
    [NeedsTheory(Needs.Astropy, Fpack, Funpack)]
    [InlineData("f4", "-r -q0 8")]
    [InlineData("f4", "-r -q77 4")]
    [InlineData("f4", "-r -qz9999 4 -t 50,7")]
    [InlineData("f4", "-g2 -q9998 -0.125")]
    [InlineData("f4", "-h -q3 8 -t 90,20")]
    [InlineData("f8", "-r -q0 8")]
    [InlineData("f8", "-r -q9990 8 -t 90,40")]
    [InlineData("f8", "-g1 -qz5 8 -t 31,11")]
    public void What_fpack_quantises_is_within_half_a_step_and_has_the_bits_of_other_readers(string type, string options)
    {
        using TemporaryFolder folder = new();
        Outside.Python(
            """
            import sys, numpy as np
            from astropy.io import fits
            rng = np.random.default_rng(4)
            data = rng.normal(50, 3, (120, 90)).astype(sys.argv[1])
            data[3:9, 5:60] = 0
            data[::11, ::7] = np.nan
            fits.PrimaryHDU(data).writeto(sys.argv[2])
            """,
            type,
            folder.File("in.fits"));
        Outside.Run(Fpack, [.. options.Split(' '), "-O", folder.File("packed.fits"), folder.File("in.fits")]);
        Outside.Run(Funpack, "-O", folder.File("plain.fits"), folder.File("packed.fits"));
        using (IStackReader reader = new FitsFormat().Open(folder.File("packed.fits"), new ReadOptions()))
            File.WriteAllBytes(folder.File("ours.raw"), PassThrough.Stored(reader, 0));
        Outside.Python(
            """
            import sys, numpy as np
            from astropy.io import fits
            kind, folder, keeps_zero = sys.argv[1], sys.argv[2], sys.argv[3] == 'True'
            before, funpack, astropy = fits.getdata(f'{folder}/in.fits'), fits.getdata(f'{folder}/plain.fits'), fits.getdata(f'{folder}/packed.fits', 1)
            ours = np.fromfile(f'{folder}/ours.raw', '<' + kind).reshape(before.shape)
            with fits.open(f'{folder}/packed.fits', disable_image_compression=True) as hdus:
                header, step = hdus[1].header, hdus[1].data['ZSCALE']
            there = ~np.isnan(before)
            assert np.array_equal(there, ~np.isnan(ours))
            columns = -(-header['ZNAXIS1'] // header['ZTILE1'])
            y, x = np.mgrid[:before.shape[0], :before.shape[1]]
            half = step[y // header['ZTILE2'] * columns + x // header['ZTILE1']] / 2
            error = np.abs(ours.astype('f8') - before)
            assert np.all(error[there] <= half[there] + 1e-5), error[there].max()
            assert error[there].max() > 0.9 * half.min()
            assert not keeps_zero or np.all(ours[before == 0] == 0)
            assert np.array_equal(ours[there], astropy[there])
            assert columns > 1 or np.array_equal(ours, funpack, equal_nan=True)
            """,
            type,
            folder.Path,
            options.Contains("-qz", StringComparison.Ordinal).ToString());
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
