using System.Security.Cryptography;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Formats.Tiff;
using Stacks.Tests.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Matrix;

/// <summary>
/// Every sample type through an empty recipe, from and to every container and coding: the samples keep their bits. What
/// came out is read back by us, and by readers that know nothing of this project: astropy for FITS; libtiff's tiffcp,
/// then tifffile, for TIFF.
/// </summary>
public class MatrixTests
{
    private const int Width = 19;
    private const int Height = 14;
    private const int Frames = 2;

    public static TheoryData<SampleType> Types => [.. Enum.GetValues<SampleType>()];

    [NeedsTheory(Needs.Astropy, Needs.Tifffile, "tiffcp")]
    [MemberData(nameof(Types))]
    public void An_empty_recipe_keeps_every_bit(SampleType type)
    {
        using Work work = new(type);
        foreach (string source in work.Sources().ToList())
        {
            foreach ((string format, string compression) in Outputs)
            {
                if (IsPossible(type, format, compression))
                    work.Run(source, format, compression);
                else
                    Assert.Contains(compression is "deflate" or "zstd" ? "FITS results cannot be compressed so" : "FITS cannot store float16", Assert.Throws<RecipeException>(() => work.Run(source, format, compression)).Message, StringComparison.Ordinal);
            }
        }

        work.CheckWithOthers();
    }

    private static (string Format, string Compression)[] Outputs { get; } =
        [("fits", "none"), ("fits", "lossless"), ("fits", "deflate"), ("fits", "zstd"), ("tiff", "none"), ("tiff", "deflate"), ("tiff", "zstd")];

    private static bool IsPossible(SampleType type, string format, string compression) =>
        format == "tiff" || (type != SampleType.Float16 && compression is "none" or "lossless");

    /// <summary>Files of one sample type in a folder, all with the same samples.</summary>
    private sealed class Work(SampleType type) : IDisposable
    {
        private readonly TemporaryFolder folder = new();
        private readonly byte[][] frames = [.. Enumerable.Range(0, Frames).Select(f => Samples(type, f))];
        private readonly List<string> made = [];

        /// <summary>Sources that this project did not write, but for FITS and ZSTD: those are results of a first pass, which others read too.</summary>
        public IEnumerable<string> Sources()
        {
            string plain = "";
            foreach (bool big in new[] { false, true })
            {
                foreach (bool bigEndian in new[] { false, true })
                {
                    foreach ((int compression, int predictor) in new[] { (1, 1), (8, 1), (8, Predictor), (5, 1), (5, Predictor) })
                    {
                        string path = folder.File($"{(big ? "big" : "classic")}-{(bigEndian ? "MM" : "II")}-{compression}-{predictor}.tif");
                        File.WriteAllBytes(path, TinyTiff.Build(big, bigEndian, [.. frames.Select(samples => Page(samples, compression, predictor))]));
                        if (compression == 1)
                            plain = path;
                        yield return path;
                    }

                    yield return Run(plain, "tiff", "zstd");
                }
            }

            if (type == SampleType.Float16)
                yield break;
            yield return Run(plain, "fits", "none");
            yield return Run(plain, "fits", "lossless");
        }

        /// <summary>Runs an empty recipe, reads the result back and returns its path.</summary>
        public string Run(string source, string format, string compression)
        {
            string target = folder.File($"{made.Count}-{Path.GetFileNameWithoutExtension(source)}-{compression}.{format}");
            HostRun.Of($"[output]\nformat = \"{format}\"\ncompression = \"{compression}\"\n", source, target);

            using IStackReader reader = (format == "fits" ? (IStackFormat)new FitsFormat() : new TiffFormat()).Open(target, new ReadOptions());
            Assert.Equal((Frames, type, Width, Height), (reader.FrameCount, reader.Layout(0).SampleType, reader.Layout(0).Width, reader.Layout(0).Height));
            for (int f = 0; f < Frames; f++)
                Assert.Equal(frames[f], PassThrough.Stored(reader, f));
            if (format == "tiff" && source.EndsWith("tif", StringComparison.Ordinal))
                Assert.Equal(Start(source), Start(target));
            made.Add(target);
            return target;
        }

        /// <summary>The header's byte order and kind are kept from TIFF to TIFF.</summary>
        private static byte[] Start(string path) => File.ReadAllBytes(path)[..4];

        public void CheckWithOthers()
        {
            string digest = Convert.ToHexStringLower(SHA256.HashData([.. frames.SelectMany(f => f)]));
            ToolResult result = Tool.Run(Tool.Python, ["-c", Script, type.Name(), folder.Path, .. made]);
            Assert.Equal("", result.Error);
            Assert.Equal(0, result.ExitCode);
            Assert.Equal(made.Select(_ => digest), result.Output.Split('\n', StringSplitOptions.RemoveEmptyEntries));
        }

        public void Dispose() => folder.Dispose();

        private int Predictor => type.IsInteger() ? 2 : 3;

        private TinyPage Page(byte[] samples, int compression, int predictor) => new()
        {
            Width = Width,
            Height = Height,
            Bits = 8 * type.Size(),
            Format = SampleFormat(type),
            Samples = samples,
            Compression = compression,
            Predictor = predictor,
        };

        private static int SampleFormat(SampleType type) => type.IsInteger() ? (type.Minimum() < 0 ? 2 : 1) : 3;

        private static byte[] Samples(SampleType type, int seed) =>
            type is SampleType.Float16 ? TinyTiff.SomeSamples(Width * Height, 16, 3, seed) : ForeignStack.Frame(type, Width, Height, seed).Stored;

        /// <summary>
        /// Prints the SHA-256 of the samples of each file, little-endian and in order. FITS: stored integers as they are,
        /// with the sign convention's BZERO undone in integer arithmetic (FITS Standard 4.0, table 11).
        /// </summary>
        private const string Script =
            """
            import gzip, hashlib, os, subprocess, sys, warnings
            import numpy as np, tifffile
            from astropy.io import fits
            warnings.simplefilter('ignore')
            kind = np.dtype(sys.argv[1]).newbyteorder('<')

            def of_fits(path):
                with fits.open(path, disable_image_compression=True) as hdus:
                    table = hdus[1] if len(hdus) > 1 and hdus[1].header.get('ZIMAGE') else None
                    # This astropy decodes no tiles of 64-bit integers: gzip of Python's library, and GZIP_2's shuffling undone by hand.
                    by_hand = table is not None and table.header['ZBITPIX'] == 64
                    if by_hand:
                        assert table.header['ZCMPTYPE'] == 'GZIP_2'
                        tiles = [np.frombuffer(gzip.decompress(row['COMPRESSED_DATA'].tobytes()), 'u1') for row in table.data]
                        data = np.concatenate([np.ascontiguousarray(t.reshape(8, -1).T).view('>i8').ravel() for t in tiles])
                        zero = table.header.get('BZERO', 0)
                if not by_hand:
                    with fits.open(path, do_not_scale_image_data=True, memmap=False) as hdus:
                        hdu = next(h for h in hdus if h.is_image and h.data is not None)
                        data = np.ascontiguousarray(hdu.data)
                        zero = hdu.header.get('BZERO', 0)
                bits = data.astype(data.dtype.newbyteorder('<')).view(f'<u{data.dtype.itemsize}') if kind.kind in 'iu' else data
                if zero:
                    assert zero in (-128, 2**15, 2**31, 2**63), zero
                    bits = bits ^ bits.dtype.type(1 << (8 * kind.itemsize - 1))
                return bits.view(kind) if kind.kind in 'iu' else bits.astype(kind)

            def of_tiff(path):
                plain = os.path.join(sys.argv[2], 'plain')
                subprocess.run(['tiffcp', '-c', 'none', path, plain], check=True, capture_output=True)
                with tifffile.TiffFile(plain) as t:
                    pages = [p.asarray() for p in t.pages]
                assert all(p.dtype.newbyteorder('<') == kind for p in pages), pages[0].dtype
                return np.stack(pages).astype(kind)

            for path in sys.argv[3:]:
                data = of_fits(path) if path.endswith('.fits') else of_tiff(path)
                print(hashlib.sha256(data.tobytes()).hexdigest())
            """;
    }
}
