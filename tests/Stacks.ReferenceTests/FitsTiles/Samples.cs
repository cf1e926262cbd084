namespace Stacks.ReferenceTests.FitsTiles;

/// <summary>Files that astropy makes.</summary>
internal static class Samples
{
    /// <summary>
    /// A cube in the primary and an image in an extension: of which type, the file, and <c>all</c> for NaN, infinities and
    /// -0 among floats or <c>finite</c> for none of them. Integers have the ends of their type.
    /// </summary>
    public const string MakeFile =
        """
        import sys, numpy as np
        from astropy.io import fits
        kind, path, ends = sys.argv[1:]
        dtype = np.dtype(kind)
        rng = np.random.default_rng(1)
        def samples(shape):
            if dtype.kind == 'f':
                a = rng.normal(100, 10, shape).astype(dtype)
                if ends == 'finite':
                    return a
                a.flat[:5] = [np.nan, np.inf, -np.inf, -0.0, np.finfo(dtype).max]
            else:
                i = np.iinfo(dtype)
                a = (rng.normal(100, 10, shape).astype('i8') + (i.min if i.min < 0 else 0) // 3).astype(dtype)
                a.flat[:4] = [i.min, i.max, 0, 1]
            return a
        first = fits.PrimaryHDU(samples((4, 23, 37)))
        first.header['OBJECT'] = 'M13'
        first.header['LONGSTRN'] = 'OGIP 1.0'
        first.header['LONGTEXT'] = 'a string that goes on and on ' * 9
        first.header['HIERARCH SOME DEEP KEYWORD'] = (1.5, 'hierarchical')
        first.header['HISTORY'] = 'made by astropy'
        fits.HDUList([first, fits.ImageHDU(samples((50, 41)), name='SECOND')]).writeto(path)
        """;

    /// <summary>
    /// Compressed images that astropy's own compression makes, a file each, named by what is odd about it; into a folder.
    /// </summary>
    public const string MakeCompressed =
        """
        import sys, warnings, numpy as np
        from astropy.io import fits
        warnings.simplefilter('ignore')
        folder = sys.argv[1]
        rng = np.random.default_rng(2)
        def save(name, *images):
            fits.HDUList([fits.PrimaryHDU(), *images]).writeto(f'{folder}/{name}.fits')
        def sky(shape, dtype, level=200, noise=9):
            return (rng.normal(level, noise, shape)).astype(dtype)
        def comp(data, tile_size=None, **more):
            return fits.CompImageHDU(data, tile_size=tile_size and list(tile_size), **more)
        for kind in 'u1', 'i2', 'u2', 'i4', 'u4':
            for way, tile in ('RICE_1', (7, 5)), ('GZIP_1', (50, 3)), ('GZIP_2', (13, 20)), ('HCOMPRESS_1', (20, 10)), ('PLIO_1', (9, 4)):
                if way == 'PLIO_1' and kind in ('u2', 'u4'):
                    continue  # astropy does not take them
                save(f'{way}-{kind}', comp(np.abs(sky((41, 53), kind, 100)), compression_type=way, tile_size=tile))
        for kind in 'f4', 'f8':
            data = sky((41, 53), kind)
            data[5:9, 3:30] = 0
            holes = data.copy()
            holes[::7, ::5] = np.nan
            holes[11] = np.nan
            flat = data.copy()
            flat[20:25] = 17.25
            for method in -1, 1, 2:
                for what, samples in ('sky', data), ('holes', holes), ('flat', flat):
                    for way, tile in ('RICE_1', (53, 1)), ('GZIP_1', (20, 9)), ('GZIP_2', (53, 4)), ('HCOMPRESS_1', (53, 20)):
                        if what == 'sky' or way in ('RICE_1', 'GZIP_2'):
                            save(f'{way}-{kind}-{method}-{what}', comp(samples, compression_type=way, tile_size=tile, quantize_level=8, quantize_method=method, dither_seed=9990))
            for way in 'GZIP_1', 'GZIP_2':
                save(f'{way}-{kind}-lossless', comp(holes, compression_type=way, quantize_level=0))
        cube = sky((6, 23, 31), 'i2')
        for tile in (31, 23, 1), (31, 1, 6), (10, 7, 4), (31, 23, 6), (4, 4, 4):
            save('cube-' + 'x'.join(map(str, tile)), comp(cube, compression_type='RICE_1', tile_size=tile))
        save('cube-f4', comp(sky((6, 23, 31), 'f4'), compression_type='RICE_1', tile_size=(10, 7, 4), quantize_method=1, dither_seed=77))
        save('several', comp(sky((20, 30), 'i2'), name='SCI', ver=1), fits.ImageHDU(sky((20, 30), 'u2'), name='SCI', ver=3), comp(sky((20, 30), 'f4'), name='SCI', ver=2))
        """;
}
