using System.Runtime.InteropServices;
using BitMiracle.LibTiff.Classic;
using NetVips;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;
using LibTiff = BitMiracle.LibTiff.Classic.Tiff;

namespace Stacks.ReferenceTests.Tiff;

/// <summary>
/// Every sample type, arrangement, compression, predictor, byte order and container against libtiff's tiffcp (reading what it
/// writes, and it reading what we write), with tifffile between raw samples and plain TIFF; and what we write against NetVips
/// and LibTiff.NET. The files are made once for all tests.
/// </summary>
public class LibtiffTests(LibtiffFiles files) : IClassFixture<LibtiffFiles>
{
    private static readonly TiffFormat Format = new();

    [NeedsFact(Needs.Tifffile, LibtiffFiles.Tiffcp)]
    public void What_tiffcp_writes_is_read_bit_for_bit()
    {
        HashSet<string> schemes = [];
        foreach (LibtiffFile file in files.All)
        {
            using IStackReader reader = Format.Open(file.Path, new ReadOptions());
            Assert.Equal(2 * file.Samples, reader.FrameCount);
            for (int f = 0; f < reader.FrameCount; f++)
            {
                Assert.Equal(file.Type, reader.Layout(f).SampleType.Name());
                Assert.Equal(file.Samples == 1 ? null : f % file.Samples, reader.Layout(f).Channel);
                Assert.True(file.Frame(f).AsSpan().SequenceEqual(PassThrough.Stored(reader, f)), $"{file.Path}, frame {f}");
            }

            schemes.UnionWith(reader.Parts.Select(p => p.Shape.Split(',')[^1].Trim()));
        }

        Assert.Equal(
            ["Deflate", "Deflate with predictor 2", "Deflate with predictor 3", "LZW", "LZW with predictor 2", "LZW with predictor 3", "PackBits", "Zstandard", "Zstandard with predictor 2", "Zstandard with predictor 3", "uncompressed"],
            schemes.Order(StringComparer.Ordinal));
        Assert.Equal(11 * 2, files.All.Select(f => (f.Type, f.Samples)).Distinct().Count());
    }

    /// <summary>Of every type in every byte order and container: our result through tiffcp is what went in.</summary>
    [NeedsFact(Needs.Tifffile, LibtiffFiles.Tiffcp)]
    public void What_is_written_is_read_by_libtiff_bit_for_bit_in_its_container()
    {
        using TemporaryFolder folder = new();
        List<string> lines = [];
        foreach (LibtiffFile file in files.All.Where(f => f.IsPlain))
        {
            using IStackReader reader = Format.Open(file.Path, new ReadOptions());
            foreach (OutputCompression compression in (OutputCompression[])[OutputCompression.None, OutputCompression.Deflate, OutputCompression.Zstd])
            {
                string path = folder.File($"{lines.Count}.tif");
                PassThrough.Run(reader, Format, path, compression: compression);
                Assert.Equal(File.ReadAllBytes(file.Path)[..4], File.ReadAllBytes(path)[..4]);
                lines.Add(string.Join('\t', path, file.Raw, file.Type, file.Samples, compression));
            }
        }

        Assert.Equal(11 * 2 * 4 * 3, lines.Count);
        File.WriteAllLines(folder.File("list"), lines);
        LibtiffFiles.Python(
            """
            import subprocess, sys, numpy as np, tifffile
            scheme = {'None': 1, 'Deflate': 8, 'Zstd': 50000}
            for line in open(sys.argv[1] + '/list'):
                path, raw, kind, samples, compression = line.rstrip('\n').split('\t')
                with tifffile.TiffFile(path) as t:
                    assert [p.compression for p in t.pages] == [scheme[compression]] * 2 and t.pages[0].samplesperpixel == int(samples), path
                plain = sys.argv[1] + '/plain.tif'
                done = subprocess.run(['tiffcp', '-c', 'none', path, plain], capture_output=True, text=True)
                assert done.returncode == 0 and not done.stderr.replace(path, '').strip(), (line, done.stderr)
                with tifffile.TiffFile(plain) as t:
                    a = [p.asarray() for p in t.pages]
                a = np.stack(a)
                assert a.dtype.newbyteorder('=') == np.dtype(kind), (line, a.dtype)
                assert a.astype(kind).tobytes() == open(raw, 'rb').read(), line
            """,
            folder.Path);
    }

    /// <summary>NetVips reads no 64-bit samples and no 16-bit floats, and its libtiff no Zstandard.</summary>
    [NeedsFact(Needs.Tifffile, LibtiffFiles.Tiffcp)]
    public void What_is_written_is_read_by_NetVips()
    {
        Dictionary<string, Enums.BandFormat> known = new()
        {
            ["uint8"] = Enums.BandFormat.Uchar,
            ["int8"] = Enums.BandFormat.Char,
            ["uint16"] = Enums.BandFormat.Ushort,
            ["int16"] = Enums.BandFormat.Short,
            ["uint32"] = Enums.BandFormat.Uint,
            ["int32"] = Enums.BandFormat.Int,
            ["float32"] = Enums.BandFormat.Float,
        };
        using TemporaryFolder folder = new();
        int read = 0;
        foreach (LibtiffFile file in files.All.Where(f => f.IsPlain && known.ContainsKey(f.Type)))
        {
            using IStackReader reader = Format.Open(file.Path, new ReadOptions());
            foreach (OutputCompression compression in (OutputCompression[])[OutputCompression.None, OutputCompression.Deflate])
            {
                string path = folder.File($"{read++}.tif");
                PassThrough.Run(reader, Format, path, compression: compression);
                for (int page = 0; page < 2; page++)
                {
                    using Image image = Image.Tiffload(path, page: page);
                    Assert.Equal((LibtiffFile.Width, LibtiffFile.Height, file.Samples, known[file.Type]), (image.Width, image.Height, image.Bands, image.Format));
                    for (int s = 0; s < file.Samples; s++)
                    {
                        using Image band = image.ExtractBand(s);
                        nint memory = band.WriteToMemory(out ulong length);
                        byte[] bytes = new byte[length];
                        Marshal.Copy(memory, bytes, 0, bytes.Length);
                        NetVips.NetVips.Free(memory);
                        Assert.True(file.Frame((page * file.Samples) + s).AsSpan().SequenceEqual(bytes), $"{file.Path}, {compression}, page {page}, band {s}");
                    }
                }
            }
        }

        Assert.Equal(7 * 2 * 4 * 2, read);
    }

    /// <summary>LibTiff.NET is right on little-endian files up to 32 bits a sample, without Zstandard and 16-bit floats.</summary>
    [NeedsFact(Needs.Tifffile, LibtiffFiles.Tiffcp)]
    public void What_is_written_is_read_by_LibTiff_NET()
    {
        using TemporaryFolder folder = new();
        int read = 0;
        foreach (LibtiffFile file in files.All.Where(f => f.IsPlain && f.Container is "-L" or "-L -8" && !f.Type.EndsWith("64", StringComparison.Ordinal) && f.Type != "float16"))
        {
            using IStackReader reader = Format.Open(file.Path, new ReadOptions());
            string path = folder.File($"{read++}.tif");
            PassThrough.Run(reader, Format, path, compression: OutputCompression.Deflate);
            using LibTiff tiff = LibTiff.Open(path, "r");
            for (int f = 0; f < reader.FrameCount; f++)
            {
                Assert.True(tiff.SetDirectory((short)(f / file.Samples)));
                Assert.Equal(file.Samples, tiff.GetField(TiffTag.SAMPLESPERPIXEL)[0].ToInt());
                byte[] expected = file.Frame(f);
                byte[] row = new byte[tiff.ScanlineSize()];
                for (int y = 0; y < LibtiffFile.Height; y++)
                {
                    Assert.True(tiff.ReadScanline(row, 0, y, (short)(f % file.Samples)));
                    Assert.True(expected.AsSpan(y * row.Length, row.Length).SequenceEqual(row), $"{file.Path}, frame {f}, row {y}");
                }
            }
        }

        Assert.Equal(7 * 2 * 2, read);
    }
}

/// <summary>A file that tiffcp wrote, and its samples as tifffile's input had them.</summary>
/// <param name="Path">The file: two pages.</param>
/// <param name="Raw">File of all samples, little-endian, page after page, plane after plane.</param>
/// <param name="Type">Sample type.</param>
/// <param name="Samples">Samples of a pixel.</param>
/// <param name="Codec">tiffcp's name of compression and predictor.</param>
/// <param name="Container">tiffcp's options of byte order and container.</param>
public sealed record LibtiffFile(string Path, string Raw, string Type, int Samples, string Codec, string Container)
{
    /// <summary>Width of every page; no multiple of the tile's.</summary>
    public const int Width = 37;

    /// <summary>Height of every page.</summary>
    public const int Height = 23;

    /// <summary>One uncompressed file of every type and container is among these.</summary>
    public bool IsPlain => Codec == "none" && Path.EndsWith("contig-strips.tif", StringComparison.Ordinal);

    /// <summary>Samples of a frame.</summary>
    public byte[] Frame(int frame)
    {
        byte[] all = File.ReadAllBytes(Raw);
        int plane = all.Length / (2 * Samples);
        return all[(frame * plane)..((frame + 1) * plane)];
    }
}

/// <summary>The files.</summary>
public sealed class LibtiffFiles : IDisposable
{
    public const string Tiffcp = "tiffcp";

    private readonly TemporaryFolder folder = new();

    public LibtiffFiles()
    {
        if (Needs.Missing([Needs.Tifffile, Tiffcp]) is not null)
            return;
        Python(
            """
            import os, subprocess, sys, numpy as np, tifffile
            folder, width, height = sys.argv[1], int(sys.argv[2]), int(sys.argv[3])
            random = np.random.default_rng(1)
            # tiffcp changes between the two arrangements for 8 bits only: each has a source of its own.
            ways = {'contig-strips': '-s -r 5', 'separate-strips': '-s -r 7', 'contig-tiles': '-t -w 16 -l 16'}
            containers = ['-L', '-B', '-L -8', '-B -8']
            turn, lines = 0, []
            for kind in 'uint8 int8 uint16 int16 uint32 int32 uint64 int64 float16 float32 float64'.split():
                for samples in 1, 3:
                    dtype = np.dtype(kind)
                    # Pages, planes, rows: steps, noise and every bit pattern.
                    a = np.arange(2 * samples * height * width).reshape(2, samples, height, width) // 7
                    a = (a + random.integers(0, 9, a.shape)).astype(dtype)
                    a[:, :, ::4] = np.frombuffer(random.bytes(a[:, :, ::4].nbytes), dtype).reshape(a[:, :, ::4].shape)
                    raw = f'{folder}/{kind}-{samples}.raw'
                    a.astype(dtype.newbyteorder('<')).tofile(raw)
                    sources = {}
                    for planes in ('contig', 'separate')[:samples]:
                        sources[planes] = f'{folder}/{kind}-{samples}-{planes}.tif'
                        with tifffile.TiffWriter(sources[planes]) as t:
                            for page in a:
                                if samples == 1:
                                    t.write(page[0], photometric='minisblack', contiguous=False, metadata=None)
                                else:
                                    page = page if planes == 'separate' else np.ascontiguousarray(np.moveaxis(page, 0, -1))
                                    t.write(page, photometric='rgb', planarconfig=planes, contiguous=False, metadata=None)
                    # tiffcp 4.5.0 writes tiles in planes wrong beyond 8 bits (tifffile finds the same): tifffile writes them here.
                    for compression in (None, 'zlib') if samples > 1 else ():
                        turn += 1
                        path = f"{folder}/{kind}-{samples}-{compression}-separate-tiles.tif"
                        with tifffile.TiffWriter(path, byteorder='<>'[turn % 2], bigtiff=turn % 4 > 1) as t:
                            for page in a:
                                t.write(page, photometric='rgb', planarconfig='separate', tile=(16, 32), compression=compression, contiguous=False, metadata=None)
                        lines.append('\t'.join([path, raw, kind, str(samples), str(compression), '']))
                    better = 3 if dtype.kind == 'f' else 2
                    codecs = ['none', 'packbits', 'lzw', f'lzw:{better}', 'zip', f'zip:{better}', 'zstd', f'zstd:{better}']
                    if better == 3:
                        codecs += ['zip:2', 'lzw:2']
                    for codec in codecs:
                        for way, options in ways.items():
                            if way.split('-')[0] not in sources:
                                continue
                            source = sources[way.split('-')[0]]
                            plain = codec == 'none' and way == 'contig-strips'
                            turn += 1
                            # Big-endian with predictor 3 tiffcp 4.5.0 writes what it does not read back itself; what we write so, it reads.
                            some = containers[::2] if ':3' in codec else containers
                            for container in some if plain else [some[turn % len(some)]]:
                                path = f"{folder}/{kind}-{samples}-{codec.replace(':', '')}{container.replace(' ', '')}-{way}.tif"
                                done = subprocess.run(['tiffcp', *container.split(), '-c', codec, *options.split(), source, path], capture_output=True, text=True)
                                assert done.returncode == 0, (path, done.stderr)
                                lines.append('\t'.join([path, raw, kind, str(samples), codec, container]))
            open(folder + '/list', 'w').write('\n'.join(lines))
            """,
            folder.Path,
            $"{LibtiffFile.Width}",
            $"{LibtiffFile.Height}");
        All = [.. File.ReadAllLines(folder.File("list")).Select(l => l.Split('\t')).Select(l => new LibtiffFile(l[0], l[1], l[2], int.Parse(l[3], null), l[4], l[5]))];
    }

    public IReadOnlyList<LibtiffFile> All { get; } = [];

    public static void Python(string script, params string[] arguments)
    {
        ToolResult result = Tool.Run(Tool.Python, ["-c", script, .. arguments]);
        Assert.True(result.ExitCode == 0, result.Error + result.Output);
    }

    public void Dispose() => folder.Dispose();
}
