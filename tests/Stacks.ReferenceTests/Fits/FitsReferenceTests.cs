using System.Globalization;
using System.Text.RegularExpressions;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Fits;

/// <summary>Written files against readers that know nothing of this project: astropy.io.fits and fitsverify.</summary>
public partial class FitsReferenceTests
{
    private const string Fitsverify = "fitsverify";
    private static readonly FitsFormat Format = new();

    public static TheoryData<string> RealStacks =>
    [
        "astro/m13.fits", "astro/m13real.fits", "astro/gmos_multi.fits", "astro/scale.fits", "astro/blank.fits",
        "astro/checksum_ngc1316.fits", "astro/fixed-1890.fits", "astro/o4sp040b0_raw.fits", "cal/flat_005.fits",
    ];

    public static TheoryData<string> Types => ["u1", "i1", "i2", "u2", "i4", "u4", "i8", "u8", "f4", "f8"];

    [NeedsTheory(Needs.RealDataNeed, Needs.Astropy)]
    [MemberData(nameof(RealStacks))]
    public void Astropy_reads_real_stacks_alike_before_and_after(string name)
    {
        using TemporaryFolder folder = new();
        Pass(RealData.File(name), folder.File("out.fits"), mask: true);
        Compare(RealData.File(name), folder.File("out.fits"));

        // Again, with our own file as the source.
        Pass(folder.File("out.fits"), folder.File("twice.fits"), mask: true);
        Compare(folder.File("out.fits"), folder.File("twice.fits"));
    }

    [NeedsTheory(Needs.RealDataNeed, Fitsverify)]
    [MemberData(nameof(RealStacks))]
    public void Fitsverify_finds_nothing_that_it_did_not_find_in_the_input(string name)
    {
        using TemporaryFolder folder = new();
        Pass(RealData.File(name), folder.File("out.fits"), mask: true);
        Pass(folder.File("out.fits"), folder.File("twice.fits"), mask: true);
        Assert.Equal(Verify(RealData.File(name)), Verify(folder.File("out.fits")));
        Assert.Equal(Verify(RealData.File(name)), Verify(folder.File("twice.fits")));
    }

    [NeedsTheory(Needs.Astropy, Fitsverify)]
    [MemberData(nameof(Types))]
    public void Files_that_astropy_wrote_pass_to_the_bit(string type)
    {
        using TemporaryFolder folder = new();
        Python(
            """
            import sys, numpy as np
            from astropy.io import fits
            kind, path = sys.argv[1:]
            dtype = np.dtype(kind)
            rng = np.random.default_rng(1)
            def samples(shape):
                n = int(np.prod(shape))
                a = np.frombuffer(rng.bytes(n * dtype.itemsize), dtype).copy()
                if dtype.kind == 'f':
                    a[:5] = [np.nan, np.inf, -np.inf, -0.0, np.finfo(dtype).max]
                else:
                    a[:4] = [np.iinfo(dtype).min, np.iinfo(dtype).max, 0, 1]
                return a.reshape(shape)
            first = fits.PrimaryHDU(samples((2, 3, 5, 7)))
            first.header['LONGTEXT'] = 'a string that goes on and on ' * 9
            first.header['HIERARCH some deep keyword'] = (1.5, 'hierarchical')
            first.header['HISTORY'] = 'made by astropy'
            first.header['HISTORY'] = 'made by astropy'
            table = fits.BinTableHDU.from_columns([fits.Column('A', '1PJ()', array=np.array([[1, 2], [3]], dtype=object))])
            fits.HDUList([first, fits.ImageHDU(samples((6, 4)), name='SECOND'), table]).writeto(path, checksum=True)
            """,
            type,
            folder.File("in.fits"));
        Pass(folder.File("in.fits"), folder.File("out.fits"), mask: true);
        Compare(folder.File("in.fits"), folder.File("out.fits"));
        Assert.Equal(Verify(folder.File("in.fits")), Verify(folder.File("out.fits")));
    }

    [NeedsFact(Needs.Astropy, Fitsverify)]
    public void Scaling_blank_and_unsigned_types_of_new_files_are_read_by_astropy()
    {
        using TemporaryFolder folder = new();
        FrameLayout Layout(SampleType type) => ForeignStack.Frame(type, 5, 3, 1).Layout;
        byte[] Stored(SampleType type) => ForeignStack.Frame(type, 5, 3, 1).Stored;
        ForeignStack source = new(
            (Layout(SampleType.Int16) with { Transform = new ValueTransform(-0.25, 7), Blank = -1 }, Stored(SampleType.Int16)),
            (Layout(SampleType.UInt64), Stored(SampleType.UInt64)),
            (Layout(SampleType.Int8), Stored(SampleType.Int8)),
            (Layout(SampleType.Float32), Stored(SampleType.Float32)));
        PassThrough.Run(source, Format, folder.File("out.fits"), mask: true);
        Assert.Equal((0, 0), Verify(folder.File("out.fits")));
        for (int frame = 0; frame < source.FrameCount; frame++)
            File.WriteAllBytes(folder.File($"{frame}.raw"), PassThrough.Stored(source, frame));
        Python(
            """
            import sys, warnings, numpy as np
            from astropy.io import fits
            warnings.simplefilter('error')
            folder = sys.argv[1]
            raw = lambda i, t: np.fromfile(f'{folder}/{i}.raw', t).reshape(3, 5)
            with fits.open(f'{folder}/out.fits', checksum=True) as f:
                stored = raw(0, '<i2')
                values = np.where(stored == -1, np.nan, 7 - 0.25 * stored.astype(float))
                assert np.array_equal(f['FRAME', 1].data, values, equal_nan=True)
                for i, t in (1, '<u8'), (2, '<i1'), (3, '<f4'):
                    data = f['FRAME', i + 1].data
                    assert data.dtype.kind == np.dtype(t).kind and data.dtype.itemsize == np.dtype(t).itemsize, data.dtype
                    assert data.astype(t).tobytes() == raw(i, t).tobytes(), i
            """,
            folder.Path);
    }

    [NeedsFact(Needs.Astropy, Fitsverify)]
    public void Change_masks_with_64_bit_descriptors_are_read_by_astropy()
    {
        using TemporaryFolder folder = new();
        using (PartialFile file = new(folder.File("out.fits")))
        {
            using ChangeMask mask = new(folder.File("out.fits"));
            ByteBuffer tile = new();
            for (byte frame = 0; frame < 3; frame++)
            {
                ChangeMask.Compress([frame, 1, 2, 3, 4, 5], tile);
                mask.Append(tile.Written);
            }

            List<FitsCard> primary = HeaderEdit.AsPrimary(NewHeader.EmptyPrimary(), PassThrough.Created);
            file.Write(HeaderImage.Build(primary, FitsBlock.Bytes, 0), 0);
            OutputHdu hdu = new() { Label = "primary", Frames = 3, Axes = [3, 2, 3] };
            mask.WriteExtension(file, FitsBlock.Bytes, hdu, 1, longestShortHeap: 0);
        }

        Assert.Equal((0, 0), Verify(folder.File("out.fits")));
        Python(
            """
            import sys, warnings, numpy as np
            from astropy.io import fits
            warnings.simplefilter('error')
            with fits.open(sys.argv[1], disable_image_compression=True) as f:
                assert f[1].header['TFORM1'].startswith('1QB') and f[1].header['NAXIS1'] == 16
            with fits.open(sys.argv[1], checksum=True) as f:
                assert np.array_equal(f['CHANGES'].data, [[[i, 1, 2], [3, 4, 5]] for i in range(3)])
            """,
            folder.File("out.fits"));
    }

    private static void Pass(string from, string to, bool mask)
    {
        using IStackReader source = Format.Open(from, new ReadOptions());
        PassThrough.Run(source, Format, to, mask, SampleFlags.ReplacedBright);
    }

    /// <summary>
    /// Same HDUs, headers and samples, raw and scaled; a mask of the right shape for each science image; a ledger whose
    /// digests are those of the samples astropy decodes.
    /// </summary>
    private static void Compare(string before, string after) => Python(
        """
        import hashlib, sys, warnings, numpy as np
        from astropy.io import fits
        from astropy.utils.exceptions import AstropyWarning
        warnings.simplefilter('ignore', AstropyWarning)
        anew = {'DATE', 'CHECKSUM', 'DATASUM', 'DATAMIN', 'DATAMAX', 'EXTEND', ''}
        def cards(hdu):
            return [c.image for c in hdu.header.cards if c.keyword not in anew and not c.keyword.startswith('STK')]
        def little(data):
            return hashlib.sha256(np.ascontiguousarray(data, data.dtype.newbyteorder('<')).tobytes()).hexdigest()
        with fits.open(sys.argv[1]) as a, fits.open(sys.argv[2]) as b, \
             fits.open(sys.argv[1], do_not_scale_image_data=True) as ra, fits.open(sys.argv[2], do_not_scale_image_data=True) as rb:
            science = []
            for i in range(len(a)):
                assert type(a[i]) is type(b[i]), i
                assert cards(a[i]) == cards(b[i])[:len(cards(a[i]))], i
                if a[i].data is None:
                    assert b[i].data is None
                    continue
                assert a[i].data.dtype == b[i].data.dtype and a[i].data.shape == b[i].data.shape, i
                assert a[i].data.tobytes() == b[i].data.tobytes(), i
                assert ra[i].data.tobytes() == rb[i].data.tobytes(), i
                if not isinstance(a[i], (fits.BinTableHDU, fits.CompImageHDU)):
                    science.append(i)
            added = b[len(a):]
            masks = [h for h in added if h.name == 'CHANGES']
            assert len(masks) == len(science) and len(added) == len(science) + 1
            frame = 0
            for m, i in zip(masks, science):
                assert isinstance(m, fits.CompImageHDU) and m.data.shape == (b[i].data.reshape((-1,) + b[i].data.shape[-2:]) if b[i].data.ndim > 3 else b[i].data).shape and m.data.dtype == np.uint8
                for plane in m.data.reshape((-1,) + m.data.shape[-2:]):
                    assert plane.flat[0] == frame and (plane.flat[1:] == 8).all()
                    frame += 1
            ledger = added[-1]
            assert ledger.name == 'LEDGER' and isinstance(ledger, fits.BinTableHDU)
            row = 0
            for i in science:
                unsigned = b[i].data.dtype.kind == 'u' or b[i].data.dtype == np.int8
                data = b[i].data if unsigned else rb[i].data
                for plane in data.reshape((-1,) + data.shape[-2:]):
                    r = ledger.data[row]
                    assert r['FRAME'] == row and r['SRCDIGST'] == little(plane) == r['OUTDIGST'], row
                    assert r['LEVEL'] == 100.5 + row and np.isnan(r['NOISEIN']) and r['MISSING'] == (1 << 40) + 5 and r['FLAGS'] == 5
                    row += 1
            assert row == len(ledger.data)
        with warnings.catch_warnings():
            warnings.simplefilter('error')
            with fits.open(sys.argv[2], checksum=True) as b:
                for h in b:
                    if not isinstance(h, fits.CompImageHDU):
                        assert h.verify_checksum() in (1, 2) and h.verify_datasum() in (1, 2)
        """,
        before,
        after);

    private static void Python(string script, params string[] arguments)
    {
        ToolResult result = Tool.Run(Tool.Python, ["-c", script, .. arguments]);
        Assert.True(result.ExitCode == 0, result.Error);
    }

    /// <summary>Warnings and errors that fitsverify counts; 0 and 0 when it says OK.</summary>
    private static (int Warnings, int Errors) Verify(string path)
    {
        string output = Tool.Run(Fitsverify, "-q", path).Output;
        if (output.StartsWith("verification OK", StringComparison.Ordinal))
            return (0, 0);
        Match match = Counts().Match(output);
        Assert.True(match.Success, output);
        return (int.Parse(match.Groups[1].ValueSpan, CultureInfo.InvariantCulture), int.Parse(match.Groups[2].ValueSpan, CultureInfo.InvariantCulture));
    }

    [GeneratedRegex(@"(\d+) warnings and (\d+) errors")]
    private static partial Regex Counts();
}
