using System.Runtime.InteropServices;
using Stacks.Formats.Fits.Tiles;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.FitsTiles;

/// <summary>
/// Each code alone: tiles that fpack and astropy (cfitsio's code) compressed, taken out of their tables, against the samples
/// that astropy decodes of them.
/// </summary>
public class CodecReferenceTests
{
    private static readonly string[] Kinds =
    [
        "rice u1 fpack", "rice i2 fpack", "rice i4 fpack", "rice i2 astropy", "rice i4 astropy",
        "gzip1 i2 fpack", "gzip2 i2 fpack", "gzip2 i4 fpack",
        "plio u1 astropy", "plio i2 fpack", "plio i4 astropy",
        "hcompress i2 fpack", "hcompress i4 fpack", "hcompress i2 lossy", "hcompress i2 smooth", "hcompress i4 odd",
        "rice f4 none", "rice f4 dither1", "rice f4 dither2", "rice f8 dither1", "rice f8 dither2", "gzip2 f4 dither1",
    ];

    public static TheoryData<string> AllKinds => [.. Kinds];

    [NeedsTheory(Needs.Astropy, "fpack")]
    [MemberData(nameof(AllKinds))]
    public void Tiles_are_decoded_as_astropy_decodes_them(string kind)
    {
        using TemporaryFolder folder = new();
        ToolResult made = Tool.Run(Tool.Python, "-c", Script, kind, folder.Path);
        Assert.True(made.ExitCode == 0, made.Error);
        using BinaryReader reader = new(File.OpenRead(folder.File("tiles.bin")));
        int tiles = reader.ReadInt32();
        Assert.True(tiles > 1);
        for (int tile = 0; tile < tiles; tile++)
        {
            byte[] stream = reader.ReadBytes(reader.ReadInt32());
            int width = reader.ReadInt32(), count = reader.ReadInt32();
            double scale = reader.ReadDouble(), zero = reader.ReadDouble();
            long blank = reader.ReadInt64(), seed = reader.ReadInt64();
            byte[] expected = reader.ReadBytes(8 * count);
            string[] words = kind.Split(' ');
            int[] integers = Integers(words, stream, width, count);
            if (words[1][0] != 'f')
            {
                Assert.Equal(MemoryMarshal.Cast<byte, long>(expected).ToArray(), integers.Select(i => (long)i));
                continue;
            }

            long? dither = words[2] == "none" ? null : seed;
            double[] samples = new double[count];
            if (words[1] == "f4")
            {
                float[] narrow = new float[count];
                Quantisation.Restore(integers, scale, zero, blank, dither, words[2] == "dither2", narrow.AsSpan());
                samples = [.. narrow.Select(f => (double)f)];
            }
            else
            {
                Quantisation.Restore(integers, scale, zero, blank, dither, words[2] == "dither2", samples.AsSpan());
            }

            Assert.Equal(MemoryMarshal.Cast<byte, double>(expected).ToArray(), samples);
        }
    }

    private static int[] Integers(string[] kind, byte[] stream, int width, int count)
    {
        int[] integers = new int[count];
        string? problem;
        int size = kind[1][0] == 'f' ? 4 : kind[1][1] - '0';
        byte[] narrow = new byte[count * size];
        switch (kind[0], size)
        {
            case ("rice", 1):
                problem = RiceCode.Decode(stream, 32, narrow.AsSpan());
                integers = [.. narrow.Select(b => (int)b)];
                break;
            case ("rice", 2):
                problem = RiceCode.Decode(stream, 32, MemoryMarshal.Cast<byte, short>(narrow.AsSpan()));
                integers = [.. MemoryMarshal.Cast<byte, short>(narrow).ToArray().Select(s => (int)s)];
                break;
            case ("rice", 4):
                problem = RiceCode.Decode(stream, 32, integers.AsSpan());
                break;
            case ("plio", _):
                problem = PlioCode.Decode(stream, integers);
                break;
            case ("hcompress", _):
                problem = HcompressCode.Decode(stream, width, kind[2] == "smooth", integers);
                break;
            default:
                byte[] bytes = new byte[narrow.Length];
                problem = GzipTile.Decode(stream, bytes);
                if (kind[0] == "gzip2")
                    GzipTile.Unshuffle(bytes, size, narrow);
                else
                    narrow = bytes;
                integers = [.. narrow.Chunk(size).Select(s => s.Aggregate((int)(sbyte)s[0] >> 8, (value, b) => (value << 8) | b))];
                break;
        }

        Assert.Null(problem);
        return integers;
    }

    /// <summary>
    /// Makes an image of two tile rows of scenes with stars, noise and the ends of the type, compresses it, and writes the
    /// tiles with what astropy decodes. ZBLANK of quantised tiles is a keyword or a column.
    /// </summary>
    private const string Script =
        """
        import os, struct, subprocess, sys, warnings
        import numpy as np
        from astropy.io import fits
        warnings.simplefilter('ignore')
        code, kind, how = sys.argv[1].split()
        folder = sys.argv[2]
        rng = np.random.default_rng(len(sys.argv[1]))
        height, width = (38, 53) if how == 'odd' else (48, 600)
        y, x = np.mgrid[:height, :width]
        scene = 100 + 0.3 * x + rng.normal(0, 6, (height, width)) + 900 * np.exp(-((x - 20) ** 2 + (y - 17) ** 2) / 8)
        if kind[0] == 'f':
            data = scene.astype('f' + kind[1]) * 1.1
            data[3:6, 7:30] = 0
            data[9, 11] = np.nan
        elif code == 'plio':
            data = np.where(scene > 300, np.rint(scene), 0).astype(np.int64)
            data[7] = 3
            data[8, 5:300] = np.arange(295) % 200
            data = np.clip(data, 0, 255 if kind == 'u1' else 30000).astype(kind)
        else:
            data = np.clip(np.rint(scene), 0, 255 if kind == 'u1' else 30000).astype(kind)
            if code != 'hcompress':
                info = np.iinfo(kind)
                data[5, 3:9] = [info.min, info.max, info.min, 0, info.max, 1]
                data[6] = 44
            elif how != 'lossy' and how != 'smooth':
                data[11, 13] = -20000 if kind == 'i2' else 1 << 26
        plain, packed = os.path.join(folder, 'plain.fits'), os.path.join(folder, 'packed.fits')
        names = {'rice': 'RICE_1', 'gzip1': 'GZIP_1', 'gzip2': 'GZIP_2', 'plio': 'PLIO_1', 'hcompress': 'HCOMPRESS_1'}
        flags = {'rice': '-r', 'gzip1': '-g1', 'gzip2': '-g2', 'plio': '-p', 'hcompress': '-h'}
        if how == 'fpack':
            fits.PrimaryHDU(data).writeto(plain)
            tile = ['-t', f'{width},16'] if code == 'hcompress' else []
            subprocess.run(['fpack', flags[code], *tile, '-O', packed, plain], check=True)
        else:
            options = {'none': dict(quantize_method=-1), 'dither1': dict(quantize_method=1, dither_seed=77), 'dither2': dict(quantize_method=2, dither_seed=9999),
                       'lossy': dict(hcomp_scale=8), 'smooth': dict(hcomp_scale=12, hcomp_smooth=1)}.get(how, {})
            if code == 'hcompress':
                options['tile_size'] = [width, height // 2]
            if kind[0] == 'f':
                options['quantize_level'] = 16
            fits.HDUList([fits.PrimaryHDU(), fits.CompImageHDU(data, compression_type=names[code], **options)]).writeto(packed)
        decoded = fits.getdata(packed, 1)
        with fits.open(packed, disable_image_compression=True) as hdus:
            table, header = hdus[1].data, hdus[1].header
            tile_width, tile_height = header['ZTILE1'], header['ZTILE2']
            assert header['ZCMPTYPE'].startswith(names[code][:4]) and tile_width == width
            with open(os.path.join(folder, 'tiles.bin'), 'wb') as out:
                out.write(struct.pack('<i', len(table)))
                for i, row in enumerate(table):
                    stream = row['COMPRESSED_DATA'].tobytes() if code != 'plio' else row['COMPRESSED_DATA'].astype('>i2').tobytes()
                    assert stream, i
                    part = decoded[i * tile_height:(i + 1) * tile_height]
                    field = lambda name, other: row[name] if name in table.names else header.get(name, other)
                    out.write(struct.pack('<i', len(stream)) + stream + struct.pack('<ii', width, part.size))
                    out.write(struct.pack('<ddqq', field('ZSCALE', 1.0), field('ZZERO', 0.0), field('ZBLANK', 1 << 40), i + header.get('ZDITHER0', 1) - 1))
                    out.write(part.astype('<f8' if kind[0] == 'f' else '<i8').tobytes())
        """;
}
