using System.Globalization;
using System.Text.RegularExpressions;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.FitsTiles;

/// <summary>Programs of others, and the pass of a file through this project.</summary>
internal static partial class Outside
{
    private static readonly FitsFormat Format = new();

    /// <summary>Runs a command that must succeed.</summary>
    public static string Run(string command, params string[] arguments)
    {
        ToolResult result = Tool.Run(command, arguments);
        Assert.True(result.ExitCode == 0, $"{command} {string.Join(' ', arguments)}: {result.Error}{result.Output}");
        return result.Output;
    }

    /// <summary>Runs a script that must succeed.</summary>
    public static void Python(string script, params string[] arguments)
    {
        ToolResult result = Tool.Run(Tool.Python, ["-c", script, .. arguments]);
        Assert.True(result.ExitCode == 0, result.Error);
    }

    /// <summary>Writes a stack as it is.</summary>
    public static void Pass(string from, string to, bool compress = false, bool mask = false)
    {
        using IStackReader source = Format.Open(from, new ReadOptions());
        PassThrough.Run(source, Format, to, mask, SampleFlags.ReplacedBright, compress: compress);
    }

    /// <summary>Warnings and errors that fitsverify counts; 0 and 0 when it says OK.</summary>
    public static (int Warnings, int Errors) Verify(string path)
    {
        string output = Tool.Run("fitsverify", "-q", path).Output;
        if (output.StartsWith("verification OK", StringComparison.Ordinal))
            return (0, 0);
        Match match = Counts().Match(output);
        Assert.True(match.Success, output);
        return (int.Parse(match.Groups[1].ValueSpan, CultureInfo.InvariantCulture), int.Parse(match.Groups[2].ValueSpan, CultureInfo.InvariantCulture));
    }

    /// <summary>
    /// Frames of our reader against planes of astropy's: stored samples, NaN for NaN. Images that only one of them takes for
    /// images would differ in number.
    /// </summary>
    public static void AssertAstropyAgrees(TemporaryFolder folder, params string[] paths)
    {
        foreach (string path in paths)
        {
            using IStackReader reader = Format.Open(path, new ReadOptions());
            string frames = folder.File(Path.GetFileName(path) + ".frames");
            Directory.CreateDirectory(frames);
            for (int frame = 0; frame < reader.FrameCount; frame++)
                File.WriteAllBytes(Path.Combine(frames, string.Create(CultureInfo.InvariantCulture, $"{frame}.raw")), PassThrough.Stored(reader, frame));
        }

        Python(
            """
            import os, sys, warnings, numpy as np
            from astropy.io import fits
            warnings.simplefilter('ignore')
            for path in sys.argv[2:]:
                folder, frame = f'{sys.argv[1]}/{os.path.basename(path)}.frames', 0
                with fits.open(path) as f:
                    for hdu in f:
                        if not isinstance(hdu, (fits.PrimaryHDU, fits.ImageHDU, fits.CompImageHDU)) or hdu.data is None or hdu.name == 'CHANGES':
                            continue
                        for plane in hdu.data.reshape((-1,) + hdu.data.shape[-2:]):
                            ours = np.fromfile(f'{folder}/{frame}.raw', plane.dtype.newbyteorder('<')).reshape(plane.shape)
                            theirs = plane.astype(ours.dtype)
                            assert np.array_equal(ours, theirs, equal_nan=ours.dtype.kind == 'f'), (path, frame, np.argwhere(ours != theirs)[:5], ours[ours != theirs][:5], theirs[ours != theirs][:5])
                            frame += 1
                assert frame == len(os.listdir(folder)), (path, frame)
            """,
            [folder.Path, .. paths]);
    }

    /// <summary>Frames of two files by our reader: layouts and samples.</summary>
    public static void AssertSameFrames(string plain, string packed)
    {
        using IStackReader expected = Format.Open(plain, new ReadOptions());
        using IStackReader actual = Format.Open(packed, new ReadOptions());
        Assert.Equal(expected.FrameCount, actual.FrameCount);
        for (int frame = 0; frame < expected.FrameCount; frame++)
        {
            Assert.Equal(expected.Layout(frame), actual.Layout(frame));
            Assert.True(PassThrough.Stored(expected, frame).AsSpan().SequenceEqual(PassThrough.Stored(actual, frame)), $"frame {frame}");
        }
    }

    [GeneratedRegex(@"(\d+) warnings and (\d+) errors")]
    private static partial Regex Counts();
}
