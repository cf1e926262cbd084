using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Tiff;

/// <summary>Read and written TIFF against programs that know nothing of this project: tifffile and libtiff's tools.</summary>
public class TiffReferenceTests
{
    private const string Tiffinfo = "tiffinfo";
    private const string Tiffcp = "tiffcp";
    private static readonly TiffFormat Format = new();

    /// <summary>
    /// Reads both files page by page, the samples of a pixel as planes; what this tifffile cannot decode goes through libtiff's
    /// tiffcp first.
    /// </summary>
    private const string SamePages =
        """
        import os, subprocess, sys, tempfile, numpy as np, tifffile

        def planes(page):
            a = page.asarray()
            return np.moveaxis(a, -1, 0) if page.samplesperpixel > 1 and page.planarconfig == 1 else a

        def pages(path):
            try:
                with tifffile.TiffFile(path) as t:
                    return [planes(p) for p in t.pages]
            except (ValueError, KeyError, TypeError):
                plain = os.path.join(tempfile.mkdtemp(), 'plain.tif')
                subprocess.run(['tiffcp', '-c', 'none', path, plain], check=True, capture_output=True)
                with tifffile.TiffFile(plain) as t:
                    return [planes(p) for p in t.pages]

        native = lambda a: a.astype(a.dtype.newbyteorder('='))
        paths = sys.argv[1:]
        for before, after in zip(paths[::2], paths[1::2]):
            a, b = pages(before), pages(after)
            assert len(a) == len(b), (before, len(a), len(b))
            for i, (x, y) in enumerate(zip(a, b)):
                x, y = native(x), native(y)
                assert x.dtype == y.dtype and x.shape == y.shape, (before, i, x.dtype, y.dtype, x.shape, y.shape)
                assert x.tobytes() == y.tobytes(), (before, i)
            print(os.path.basename(before), len(a), a[0].dtype, a[0].shape)
        """;

    private static readonly string[] Micro =
        ["cancer_cell_migration_crop.tif", "BBBC022_IXMtest_A02_s9.tif", "multi-channel-z-series.ome.tif"];

    public static TheoryData<string> MicroStacks => [.. Micro];

    [NeedsTheory(Needs.RealDataNeed, Needs.Tifffile, Tiffcp)]
    [InlineData(false)]
    [InlineData(true)]
    public void Tifffile_reads_real_stacks_alike_before_and_after(bool compress)
    {
        using TemporaryFolder folder = new();
        List<string> pairs = [];
        foreach (string name in Micro)
        {
            string path = RealData.File("micro", name);
            pairs.AddRange([path, Pass(path, folder.File(name), compress)]);
        }

        Python(SamePages, [.. pairs]);
    }

    /// <summary>Every variant in the collection is read as libtiff reads it, or refused by name.</summary>
    [NeedsFact(Needs.RealDataNeed, Needs.Tifffile, Tiffcp)]
    public void Variants_are_read_as_libtiff_reads_them_or_refused()
    {
        using TemporaryFolder folder = new();
        List<string> pairs = [];
        List<string> refused = [];
        foreach (string path in Directory.GetFiles(RealData.File("format")).Order(StringComparer.Ordinal))
        {
            try
            {
                foreach (bool compress in new[] { false, true })
                    pairs.AddRange([path, Pass(path, folder.File($"{compress}-{Path.GetFileName(path)}"), compress)]);
            }
            catch (StackFormatException error)
            {
                Assert.Contains(Path.GetFileName(path), error.Message, StringComparison.Ordinal);
                refused.Add(Path.GetFileName(path));
            }
        }

        Python(SamePages, [.. pairs]);
        Assert.Equal(
            [
                "seq-1c-12b-47c39b31.tiff", "seq-1c-12b-hpredict-47c39b31.tiff", "seq-1c-12b-miniswhite-47c39b31.tiff",
                "seq-1c-24b-072a9dc9.tiff", "seq-1c-24b-hpredict-072a9dc9.tiff", "seq-1c-24b-miniswhite-072a9dc9.tiff",
            ],
            refused);
    }

    [NeedsTheory(Needs.RealDataNeed, Tiffinfo)]
    [MemberData(nameof(MicroStacks))]
    public void Tiffinfo_complains_of_nothing_that_it_did_not_complain_of_in_the_input(string name)
    {
        using TemporaryFolder folder = new();
        string path = RealData.File("micro", name);
        HashSet<string> known = Complaints(path);
        foreach (bool compress in new[] { false, true })
            Assert.Subset(known, Complaints(Pass(path, folder.File($"{compress}-{name}"), compress)));
    }

    /// <summary>Foreign stacks of every type that TIFF holds: the writer alone, without a TIFF source to follow.</summary>
    [NeedsFact(Needs.Tifffile)]
    public void Tifffile_reads_every_sample_type_of_new_files()
    {
        using TemporaryFolder folder = new();
        foreach (SampleType type in Enum.GetValues<SampleType>().Where(t => Format.CannotStore(t) is null))
        {
            (FrameLayout layout, byte[] stored) = ForeignStack.Frame(type, 13, 7, 1);
            ForeignStack source = new((layout, stored), (layout, stored));
            File.WriteAllBytes(folder.File($"{type.Name()}.raw"), PassThrough.Stored(source, 0));
            foreach (bool compress in new[] { false, true })
                PassThrough.Run(source, Format, folder.File($"{type.Name()}-{compress}.tif"), compress: compress);
        }

        Python(
            """
            import glob, os, sys, numpy as np, tifffile
            done = 0
            for raw in sorted(glob.glob(sys.argv[1] + '/*.raw')):
                kind = os.path.basename(raw)[:-4]
                expected = np.fromfile(raw, kind).reshape(7, 13)
                for compress in 'False', 'True':
                    with tifffile.TiffFile(f'{sys.argv[1]}/{kind}-{compress}.tif') as t:
                        assert len(t.pages) == 2
                        for p in t.pages:
                            try:
                                a = p.asarray()
                            except ValueError as error:
                                # tifffile without imagecodecs has no floating point predictor.
                                assert compress == 'True' and kind.startswith('float'), (kind, error)
                                continue
                            assert a.dtype == np.dtype(kind), (kind, a.dtype)
                            assert a.tobytes() == expected.tobytes(), (kind, compress)
                            done += 1
            assert done >= 30, done
            """,
            folder.Path);
    }

    [NeedsFact(Needs.RealDataNeed, Needs.Tifffile, Needs.Astropy)]
    public void Unsigned_16_bit_passes_from_fits_to_tiff_and_back()
    {
        using TemporaryFolder folder = new();
        FitsFormat fits = new();
        using (IStackReader source = fits.Open(RealData.File("cal", "flat_005.fits"), new ReadOptions()))
            PassThrough.Run(source, Format, folder.File("x.tif"));
        using (IStackReader source = Format.Open(folder.File("x.tif"), new ReadOptions()))
            PassThrough.Run(source, fits, folder.File("back.fits"));
        Python(
            """
            import sys, numpy as np, tifffile
            from astropy.io import fits
            before = fits.getdata(sys.argv[1])
            tiff, back = tifffile.imread(sys.argv[2]), fits.getdata(sys.argv[3])
            assert before.dtype == tiff.dtype == back.dtype == np.uint16, (before.dtype, tiff.dtype, back.dtype)
            assert np.array_equal(before, tiff) and np.array_equal(before, back)
            """,
            RealData.File("cal", "flat_005.fits"),
            folder.File("x.tif"),
            folder.File("back.fits"));
    }

    /// <summary>The companion of 8-bit pages, its bits as SampleFlags numbers them.</summary>
    [NeedsFact(Needs.RealDataNeed, Needs.Tifffile)]
    public void Tifffile_reads_the_change_mask()
    {
        using TemporaryFolder folder = new();
        using (IStackReader source = Format.Open(RealData.File("micro", "cancer_cell_migration_crop.tif"), new ReadOptions()))
            PassThrough.Run(source, Format, folder.File("x.tif"), mask: true, flag: SampleFlags.ReplacedBright);
        Python(
            """
            import sys, numpy as np, tifffile
            mask = tifffile.imread(sys.argv[1])
            assert mask.shape == (48, 130, 130) and mask.dtype == np.uint8, (mask.shape, mask.dtype)
            assert np.array_equal(mask[:, 0, 0], np.arange(48)) and (mask[:, 1:] == 8).all()
            """,
            folder.File("x.changes.tif"));
    }

    /// <summary>OME-TIFF specification: the XML of the first page describes every plane; the schema's order of elements.</summary>
    [NeedsFact(Needs.RealDataNeed, Needs.Tifffile)]
    public void The_ome_xml_keeps_its_elements_and_gains_an_annotation_at_its_place()
    {
        using TemporaryFolder folder = new();
        string input = RealData.File("micro", "multi-channel-z-series.ome.tif");
        string output = Pass(input, folder.File(Path.GetFileName(input)), compress: false);
        Python(
            """
            import sys, xml.etree.ElementTree as E, tifffile
            before, after = (tifffile.TiffFile(p) for p in sys.argv[1:3])
            assert after.is_ome and before.series[0].axes == after.series[0].axes and before.series[0].shape == after.series[0].shape
            a, b = E.fromstring(before.ome_metadata), E.fromstring(after.ome_metadata)
            name = lambda e: e.tag.split('}')[1]
            order = ['Rights', 'Project', 'Dataset', 'Folder', 'Experiment', 'Plate', 'Screen', 'Experimenter', 'ExperimenterGroup',
                     'Instrument', 'Image', 'StructuredAnnotations', 'ROI', 'BinaryOnly']
            names = [name(e) for e in b]
            assert 'StructuredAnnotations' in names and sorted(names, key=order.index) == names, names
            # A new file has a new UUID, which its TiffData repeat.
            kept = lambda root: [E.tostring(e).decode().replace(root.get('UUID'), '') for e in root if name(e) != 'StructuredAnnotations']
            assert kept(a) == kept(b) and a.get('UUID') != b.get('UUID')
            """,
            input,
            output);
    }

    private static string Pass(string input, string output, bool compress)
    {
        using IStackReader source = Format.Open(input, new ReadOptions());
        PassThrough.Run(source, Format, output, compress: compress);
        return output;
    }

    /// <summary>tiffinfo's error and warning lines, without the file's name.</summary>
    private static HashSet<string> Complaints(string path)
    {
        ToolResult result = Tool.Run(Tiffinfo, path);
        Assert.Equal(0, result.ExitCode);
        return [.. result.Error.Split('\n', StringSplitOptions.RemoveEmptyEntries).Select(line => line.Replace(path, "", StringComparison.Ordinal))];
    }

    private static void Python(string script, params string[] arguments)
    {
        ToolResult result = Tool.Run(Tool.Python, ["-c", script, .. arguments]);
        Assert.True(result.ExitCode == 0, result.Error + result.Output);
    }
}
