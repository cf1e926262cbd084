using System.IO.Compression;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>
/// Files cut at every block and changed at random: a right read, or a typed error that names file and place, in bounded
/// memory. A fault names its case, and the same case can be run again by itself.
/// </summary>
public sealed class MutationTests
{
    /// <summary>Small files of all kinds of HDU; the last two gzipped and in compressed tiles.</summary>
    private static readonly (string Name, byte[] Bytes)[] Own = [.. OwnFixtures()];

    [Fact]
    public void Mutated_files_are_read_or_refused()
    {
        using TemporaryFolder folder = new();
        int refused = 0;
        for (int seed = 0; seed < 10_000; seed++)
        {
            (string name, byte[] bytes) = Own[seed % Own.Length];

            // Half of all changes go into the first header, where the numbers are.
            refused += Try(folder, $"{name}, seed {seed}", Mutations.Of(bytes, seed, 2880), seed % 3 == 0) is null ? 0 : 1;
        }

        Assert.InRange(refused, 1000, 9500);
    }

    /// <summary>Digits of the numbers in headers changed: what the sizes of the standard's equations are computed from.</summary>
    [Fact]
    public void Numbers_of_headers_may_be_any()
    {
        using TemporaryFolder folder = new();
        Random random = new(11);
        for (int trial = 0; trial < 3000; trial++)
        {
            (string name, byte[] whole) = Own[trial % (Own.Length - 2)];
            byte[] bytes = [.. whole];
            int card = random.Next(bytes.Length / 80) * 80;
            string number = random.Next(4) switch { 0 => "-1", 1 => long.MaxValue.ToString(System.Globalization.CultureInfo.InvariantCulture), 2 => random.NextInt64().ToString(System.Globalization.CultureInfo.InvariantCulture), _ => random.Next(100000).ToString(System.Globalization.CultureInfo.InvariantCulture) };
            if (bytes[card + 8] == (byte)'=')
                System.Text.Encoding.ASCII.GetBytes(number.PadLeft(20)).CopyTo(bytes, card + 10);
            Try(folder, $"{name}, trial {trial}", bytes, trial % 3 == 0);
        }
    }

    [NeedsFact(Needs.RealDataNeed)]
    public void Mutated_real_files_are_read_or_refused()
    {
        using TemporaryFolder folder = new();
        (string Name, byte[] Bytes)[] files = [.. Directory.GetFiles(RealData.File("astro")).Order(StringComparer.Ordinal).Select(p => (Path.GetFileName(p), File.ReadAllBytes(p)))];
        for (int seed = 0; seed < 1500; seed++)
        {
            (string name, byte[] bytes) = files[seed % files.Length];
            Try(folder, $"{name}, seed {seed}", Mutations.Of(bytes, seed, 5760), seed % 3 == 0);
        }
    }

    /// <summary>Cut at every block of 2880 bytes, and one byte before and after it, a file gives what the whole one holds or nothing.</summary>
    [NeedsFact(Needs.RealDataNeed)]
    public void Real_files_cut_at_every_block_are_refused_or_read_right()
    {
        using TemporaryFolder folder = new();
        string[] files = [.. Directory.GetFiles(RealData.File("astro"), "*.fits"), .. Directory.GetFiles(Path.Combine(Checkout.Root, "sample-stacks"), "four*.fits")];
        foreach (string file in files.Order(StringComparer.Ordinal))
            CutEverywhere(folder, Path.GetFileName(file), File.ReadAllBytes(file), 120);
    }

    [Fact]
    public void Own_files_cut_at_every_block_are_refused_or_read_right()
    {
        using TemporaryFolder folder = new();
        foreach ((string name, byte[] bytes) in Own)
            CutEverywhere(folder, name, bytes, int.MaxValue);
    }

    private static void CutEverywhere(TemporaryFolder folder, string name, byte[] bytes, int most)
    {
        List<byte[]> whole = [];
        try
        {
            using IStackReader reader = Open(folder, bytes, false);
            for (int frame = 0; frame < reader.FrameCount; frame++)
                whole.Add(PassThrough.Stored(reader, frame));
        }
        catch (StackFormatException)
        {
            return;
        }

        int[] cuts = [.. Enumerable.Range(0, (bytes.Length / 2880) + 1).SelectMany(block => new[] { (2880 * block) - 1, 2880 * block, (2880 * block) + 1 }).Where(cut => cut > 0 && cut < bytes.Length)];
        int step = Math.Max(1, cuts.Length / most);
        for (int i = 0; i < cuts.Length; i += step)
        {
            foreach (bool salvage in new[] { false, true })
            {
                StacksException? refusal = Bounded.Run($"{name} cut at {cuts[i]}, salvage {salvage}", "in.fits", () =>
                {
                    using IStackReader reader = Open(folder, bytes[..cuts[i]], salvage);

                    // Frames of HDUs that are gone without a trace are not known to be missing.
                    Assert.InRange(reader.FrameCount, 1, whole.Count);
                    for (int frame = 0; frame < reader.FrameCount; frame++)
                        Assert.Equal(whole[frame], PassThrough.Stored(reader, frame));
                });
                Assert.True(refusal is null or StackFormatException, $"{name} cut at {cuts[i]}: {refusal}");
            }
        }
    }

    private static StacksException? Try(TemporaryFolder folder, string name, byte[] bytes, bool salvage) => Bounded.Run(name, "in.fits", () =>
    {
        using IStackReader reader = Open(folder, bytes, salvage);
        _ = reader.Parts;
        _ = reader.Facts;
        _ = reader.Losses;
        ByteBuffer raw = new(), stored = new();
        for (int frame = 0; frame < Math.Min(reader.FrameCount, 20); frame++)
        {
            FrameLayout layout = reader.Layout(frame);
            _ = reader.NoiseOf(frame);
            reader.Read(frame, raw);
            reader.Decode(frame, raw.Written, stored.Resize((int)layout.StoredBytes));
            reader.MarkQuality(frame, new Plane<SampleFlags>(new SampleFlags[layout.Length], layout.Width, layout.Height));
        }

        foreach (HealthFinding finding in reader.CheckHealth(CancellationToken.None).Take(20))
            Assert.NotEmpty(finding.Text);
    });

    private static IStackReader Open(TemporaryFolder folder, byte[] bytes, bool salvage)
    {
        File.WriteAllBytes(folder.File("in.fits"), bytes);
        return new FitsFormat().Open(folder.File("in.fits"), new ReadOptions { AllowTruncated = salvage });
    }

    private static IEnumerable<(string Name, byte[] Bytes)> OwnFixtures()
    {
        byte[] cube = new FitsBytes()
            .Primary(16, [30, 20, 3], Noise(3600, 1), FitsBytes.Card("BZERO", 32768), FitsBytes.Card("BSCALE", 1), FitsBytes.Card("GAIN", 1.5), FitsBytes.Card("RDNOISE", 4))
            .ToArray();
        yield return ("cube", cube);
        yield return ("extensions", new FitsBytes()
            .Primary(8, [], [], FitsBytes.Card("EXTEND", "T"))
            .Image(-32, [12, 10], Noise(480, 2), FitsBytes.Text("EXTNAME", "SCI"), FitsBytes.Card("EXTVER", 1), FitsBytes.Text("BIASSEC", "[1:2,1:10]"))
            .Image(8, [12, 10], Noise(120, 3), FitsBytes.Text("EXTNAME", "DQ"), FitsBytes.Card("EXTVER", 1))
            .Image(64, [12, 10, 2], Noise(1920, 4), FitsBytes.Text("EXTNAME", "SCI"), FitsBytes.Card("EXTVER", 2), FitsBytes.Card("BLANK", 3))
            .Hdu([FitsBytes.Text("XTENSION", "BINTABLE"), FitsBytes.Card("BITPIX", 8), FitsBytes.Card("NAXIS", 2), FitsBytes.Card("NAXIS1", 10), FitsBytes.Card("NAXIS2", 5), FitsBytes.Card("PCOUNT", 7), FitsBytes.Card("GCOUNT", 1), FitsBytes.Card("TFIELDS", 1), FitsBytes.Text("TFORM1", "1PB(7)")], Noise(57, 5))
            .ToArray());
        yield return ("groups", new FitsBytes()
            .Hdu([FitsBytes.Card("SIMPLE", "T"), FitsBytes.Card("BITPIX", 16), FitsBytes.Card("NAXIS", 3), FitsBytes.Card("NAXIS1", 0), FitsBytes.Card("NAXIS2", 4), FitsBytes.Card("NAXIS3", 2), FitsBytes.Card("GROUPS", "T"), FitsBytes.Card("PCOUNT", 2), FitsBytes.Card("GCOUNT", 5)], Noise(100, 6))
            .Image(32, [9, 7], Noise(252, 7))
            .ToArray());
        using TemporaryFolder folder = new();
        File.WriteAllBytes(folder.File("cube.fits"), cube);
        HostRun.Of("[output]\ncompression = \"lossless\"\n", folder.File("cube.fits"), folder.File("packed.fits"));
        yield return ("tiles", File.ReadAllBytes(folder.File("packed.fits")));
        MemoryStream gzipped = new();
        using (GZipStream gzip = new(gzipped, CompressionLevel.Fastest))
            gzip.Write(cube);
        yield return ("gzip", gzipped.ToArray());
    }

    private static byte[] Noise(int count, int seed)
    {
        byte[] bytes = new byte[count];
        new Random(seed).NextBytes(bytes);
        return bytes;
    }
}
