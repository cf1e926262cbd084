namespace Stacks.ReferenceTests.FitsTiles;

/// <summary>Files that astropy makes.</summary>
internal static class Samples
{
    /// <summary>A cube in the primary and an image in an extension, with the ends of the type, NaN and infinities.</summary>
    public const string MakeFile =
        """
        import sys, numpy as np
        from astropy.io import fits
        kind, path = sys.argv[1:]
        dtype = np.dtype(kind)
        rng = np.random.default_rng(1)
        def samples(shape):
            if dtype.kind == 'f':
                a = rng.normal(100, 10, shape).astype(dtype)
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
}
