using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Provenance;

/// <summary>
/// Every column of a written ledger against astropy (reading), hashlib (digests) and numpy (sums, medians, and the
/// difference mask of Immerkaer 1996 written out) over input and output alone.
/// </summary>
public class LedgerTests
{
    private const string Script = """
        import sys, hashlib, numpy as np
        from astropy.io import fits
        def frames(h):
            for u in h:
                if u.name in ('CHANGES', 'LEDGER') or u.data is None or not isinstance(u, (fits.PrimaryHDU, fits.ImageHDU)): continue
                d = u.data
                for p in (d if d.ndim == 3 else [d]): yield p
        def masks(h):
            for u in h:
                if u.name == 'CHANGES':
                    for p in (u.data if u.data.ndim == 3 else [u.data]): yield p
        def digest(p): return hashlib.sha256(np.ascontiguousarray(p).astype(p.dtype.newbyteorder('<')).tobytes()).hexdigest()
        def noise(p, ok):
            p = p.astype(float)
            k = ((1, -2, 1), (-2, 4, -2), (1, -2, 1))
            h, w = p.shape
            r = sum(k[i][j] * p[i:h-2+i, j:w-2+j] for i in range(3) for j in range(3)) / 6
            g = np.logical_and.reduce([ok[i:h-2+i, j:w-2+j] for i in range(3) for j in range(3)])
            a, b = np.percentile(r[g], (25, 75))
            return (b - a) / 1.34898
        with fits.open(sys.argv[1]) as before, fits.open(sys.argv[2]) as after:
            ledger = after['LEDGER'].data
            a, b, m = list(frames(before)), list(frames(after)), list(masks(after))
            assert len(a) == len(b) == len(m) == len(ledger) > 1, (len(a), len(b), len(m), len(ledger))
            def near(x, y, t): assert abs(x - y) <= t * max(abs(x), abs(y)), (x, y)
            for i, row in enumerate(ledger):
                ok = (m[i] & 1) == 0
                x, y = a[i][ok].astype(float), b[i][ok].astype(float)
                assert row['FRAME'] == i
                assert row['SRCDIGST'] == digest(a[i]) and row['OUTDIGST'] == digest(b[i]), i
                assert (row['BRIGHT'], row['DARK'], row['KEPT']) == tuple(int(((m[i] & k) != 0).sum()) for k in (8, 16, 32))
                assert (row['SATURATD'], row['MISSING']) == tuple(int(((m[i] & k) != 0).sum()) for k in (2, 1))
                assert row['LEVEL'] == np.median(x), (row['LEVEL'], np.median(x))
                near(row['FLUXIN'], np.sum(x), 1e-12); near(row['FLUXOUT'], np.sum(y), 1e-12)
                assert abs(row['FLUXREM'] - np.sum(x - y)) <= 1e-11 * np.sum(x)
                near(row['NOISEIN'], noise(a[i], (m[i] & 3) == 0), 0.02); near(row['NOISEOUT'], noise(b[i], (m[i] & 3) == 0), 0.02)
                if a[i].dtype == b[i].dtype:
                    kept = (m[i] & 24) == 0
                    assert a[i][kept].tobytes() == b[i][kept].tobytes()
                    if a[i].dtype.kind == 'u': assert row['FLUXREM'] == int(a[i].astype(int).sum()) - int(b[i].astype(int).sum())
            print('rows', len(ledger))
        """;

    [NeedsTheory(Needs.Astropy)]
    [InlineData("night-field", "night-field.recipe.toml", 16)]
    [InlineData("night-field", "night-field-smooth.recipe.toml", 16)]
    [InlineData("four-chips", "four-chips.recipe.toml", 4)]
    public void The_ledger_says_what_numpy_finds_in_input_and_output(string stack, string recipe, int frames)
    {
        using TemporaryFolder folder = new();
        string samples = Path.Combine(Checkout.Root, "sample-stacks");
        string input = Path.Combine(samples, stack + ".fits");
        ToolResult run = Tool.Stacks("run", Path.Combine(samples, recipe), input, "-o", folder.Path);
        Assert.True(run.ExitCode == 0, run.Error);
        ToolResult check = Tool.Run(Tool.Python, "-c", Script, input, folder.File(stack + ".fits"));
        Assert.True(check.ExitCode == 0, check.Error);
        Assert.Equal($"rows {frames}\n", check.Output);
    }
}
