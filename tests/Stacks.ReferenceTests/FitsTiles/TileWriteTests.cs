using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Formats.Fits.Tiles;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.FitsTiles;

/// <summary>What is written compressed, against fitsverify, funpack and astropy, and against the run that does not compress.</summary>
public class TileWriteTests
{
    public static TheoryData<string> RealStacks =>
    [
        "astro/m13.fits", "astro/m13real.fits", "astro/gmos_multi.fits", "astro/scale.fits",
        "astro/checksum_ngc1316.fits", "astro/fixed-1890.fits", "astro/o4sp040b0_raw.fits", "cal/flat_005.fits", "astro/m13_rice.fits",
    ];

    public static TheoryData<string> Types => ["u1", "i1", "i2", "u2", "i4", "u4", "f4", "f8"];

    [NeedsTheory(Needs.RealDataNeed, Needs.Astropy, "fitsverify", "funpack")]
    [MemberData(nameof(RealStacks))]
    public void A_compressed_result_unpacks_to_the_result_that_was_not_compressed(string name)
    {
        using TemporaryFolder folder = new();
        AssertUnpacksToPlain(folder, RealData.File(name.Split('/')));
    }

    [NeedsTheory(Needs.Astropy, "fitsverify", "funpack")]
    [MemberData(nameof(Types))]
    public void Every_type_unpacks_to_the_result_that_was_not_compressed(string type)
    {
        using TemporaryFolder folder = new();
        Outside.Python(Samples.MakeFile, type, folder.File("made.fits"), "all");
        AssertUnpacksToPlain(folder, folder.File("made.fits"));
    }

    /// <summary>funpack and astropy read no compressed 64-bit integers: the tiles are taken apart by the standard's text, with zlib.</summary>
    [NeedsTheory(Needs.Astropy, "fitsverify")]
    [InlineData("i8")]
    [InlineData("u8")]
    public void Integers_of_64_bits_are_gzipped_byte_by_byte(string type)
    {
        using TemporaryFolder folder = new();
        Outside.Python(Samples.MakeFile, type, folder.File("made.fits"), "all");
        Outside.Pass(folder.File("made.fits"), folder.File("plain.fits"), mask: true);
        Outside.Pass(folder.File("made.fits"), folder.File("packed.fits"), compress: true, mask: true);
        Assert.Equal((0, 0), Outside.Verify(folder.File("packed.fits")));
        Outside.AssertSameFrames(folder.File("plain.fits"), folder.File("packed.fits"));
        Outside.Python(
            """
            import gzip, sys, numpy as np
            from astropy.io import fits
            with fits.open(sys.argv[1], do_not_scale_image_data=True) as a, fits.open(sys.argv[2], disable_image_compression=True) as b:
                for x, y in (a[0], b[1]), (a[1], b[2]):
                    assert y.header['ZCMPTYPE'] == 'GZIP_2' and 'ZQUANTIZ' not in y.header and y.header['ZBITPIX'] == 64
                    data = b''
                    for row in y.data['COMPRESSED_DATA']:
                        shuffled = np.frombuffer(gzip.decompress(row.tobytes()), 'u1')
                        data += shuffled.reshape(8, -1).T.tobytes()
                    assert data == x.data.astype('>i8').tobytes()
            """,
            folder.File("plain.fits"),
            folder.File("packed.fits"));
    }

    [NeedsTheory(Needs.Astropy, "fitsverify", "funpack")]
    [InlineData("PrimaryHDU(a((2, 3, 20, 30)))")]
    [InlineData("PrimaryHDU(), fits.ImageHDU(a((20, 30)), name='SCI', ver=1), fits.ImageHDU(a((4, 8, 9)) + 7, name='SCI', ver=2), fits.ImageHDU(a((20, 30)), name='DQ', ver=1)")]
    [InlineData("PrimaryHDU(a((20, 30))), fits.BinTableHDU.from_columns([fits.Column('A', '1PJ()', array=np.array([[1, 2], [3]], dtype=object))]), fits.ImageHDU(a((5, 5)))")]
    public void Files_of_several_parts_unpack_to_the_result_that_was_not_compressed(string parts)
    {
        using TemporaryFolder folder = new();
        Outside.Python(
            $"""
            import sys, numpy as np
            from astropy.io import fits
            a = lambda shape: np.arange(np.prod(shape)).reshape(shape).astype('i2')
            fits.HDUList([fits.{parts}]).writeto(sys.argv[1])
            """,
            folder.File("made.fits"));
        AssertUnpacksToPlain(folder, folder.File("made.fits"));
    }

    [NeedsFact(Needs.Astropy, "fitsverify", "funpack")]
    public void Tables_with_64_bit_descriptors_are_read_by_others()
    {
        using TemporaryFolder folder = new();
        Assert.Equal('P', new TilePlan(SampleType.UInt16, [30000, 30000]).DescriptorType);
        Assert.Equal('Q', new TilePlan(SampleType.UInt16, [30000, 30000, 2]).DescriptorType);
        TilePlan plan = new(SampleType.UInt16, [30, 20, 2], longestShortHeap: 0);
        byte[] samples = new byte[30 * 20 * 2 * 2];
        new Random(1).NextBytes(samples);
        using (PartialFile file = new(folder.File("packed.fits")))
        {
            List<FitsCard> cards = NewHeader.Primary([30, 20, 2], new FrameLayout { Width = 30, Height = 20, SampleType = SampleType.UInt16 }, SampleType.UInt16);
            file.Write(HeaderImage.Build(TileHeader.BarePrimary(), FitsBlock.Bytes, 0), 0);
            TileTable table = new(file, 2 * FitsBlock.Bytes, plan);
            ByteBuffer encoded = new();
            for (int frame = 0; frame < 2; frame++)
            {
                TileEncoder.Encode(plan, samples.AsSpan(frame * 1200, 1200).ToArray(), encoded);
                table.Append(encoded.Written);
            }

            uint sum = table.Finish();
            file.Write(HeaderImage.Build(TileHeader.Of(cards, plan, table.HeapBytes, table.Longest), FitsBlock.Bytes, sum), FitsBlock.Bytes);
        }

        Assert.Equal((0, 0), Outside.Verify(folder.File("packed.fits")));
        Outside.Run("funpack", "-O", folder.File("unpacked.fits"), folder.File("packed.fits"));
        File.WriteAllBytes(folder.File("samples.raw"), samples);
        Outside.Python(
            """
            import sys, numpy as np
            from astropy.io import fits
            with fits.open(sys.argv[1], disable_image_compression=True) as f:
                assert f[1].header['TFORM1'].startswith('1QB') and f[1].header['NAXIS1'] == 16
            expected = np.fromfile(sys.argv[3], '<u2').reshape(2, 20, 30)
            for data in fits.getdata(sys.argv[1], 1), fits.getdata(sys.argv[2], 0):
                assert data.dtype.kind == 'u' and np.array_equal(data, expected)
            """,
            folder.File("packed.fits"),
            folder.File("unpacked.fits"),
            folder.File("samples.raw"));
    }

    /// <summary>
    /// Plain and compressed, with change masks; the compressed one is OK to fitsverify, reads back to our own reader and to
    /// astropy as the plain one, and funpack makes the plain one's HDUs of it.
    /// </summary>
    private static void AssertUnpacksToPlain(TemporaryFolder folder, string source)
    {
        Outside.Pass(source, folder.File("plain.fits"), mask: true);
        Outside.Pass(source, folder.File("packed.fits"), compress: true, mask: true);
        Assert.True(Outside.Verify(folder.File("packed.fits")) is (0, 0) || Outside.Verify(folder.File("packed.fits")) == Outside.Verify(folder.File("plain.fits")));
        Outside.AssertSameFrames(folder.File("plain.fits"), folder.File("packed.fits"));
        Outside.Run("funpack", "-O", folder.File("unpacked.fits"), folder.File("packed.fits"));
        Outside.Python(
            """
            import sys, warnings, numpy as np
            from astropy.io import fits
            warnings.simplefilter('ignore')
            plain, packed, unpacked = sys.argv[1:]
            anew = {'CHECKSUM', 'DATASUM', ''}
            def cards(hdu):
                return [c.image for c in hdu.header.cards if c.keyword not in anew]
            def same(a, b):
                return a is None and b is None or a.dtype.newbyteorder('<') == b.dtype.newbyteorder('<') and a.shape == b.shape and a.astype(b.dtype).tobytes() == b.tobytes()
            # Astropy unpacks the masks that funpack unpacked.
            with fits.open(plain, do_not_scale_image_data=True) as a, fits.open(unpacked, do_not_scale_image_data=True) as b:
                assert len(a) == len(b), (len(a), len(b))
                for i, (x, y) in enumerate(zip(a, b)):
                    if x.name != 'CHANGES':
                        assert cards(x) == cards(y), (i, [c for c in zip(cards(x), cards(y)) if c[0] != c[1]][:3], len(cards(x)), len(cards(y)))
                    if isinstance(x, fits.BinTableHDU) and not isinstance(x, fits.CompImageHDU):
                        assert x.data is None and y.data is None or x.data.tobytes() == y.data.tobytes(), i
                    else:
                        assert same(x.data, y.data), i
            with fits.open(plain) as a, fits.open(packed) as b:
                shift = len(b) - len(a)
                assert shift in (0, 1), shift
                for i in range(len(a)):
                    x, y = a[i], b[i + shift]
                    # Of more than three axes this astropy reads no compressed image.
                    if isinstance(y, fits.CompImageHDU) and x.header['NAXIS'] <= 3 and x.name != 'CHANGES':
                        # Nor does it take BZERO = -128 of a compressed image for a sign.
                        assert np.array_equal(x.data, y.data) if x.data.dtype == 'i1' else same(x.data, y.data), i
            """,
            folder.File("plain.fits"),
            folder.File("packed.fits"),
            folder.File("unpacked.fits"));
    }
}
