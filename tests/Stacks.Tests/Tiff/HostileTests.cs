using System.Formats.Tar;
using System.IO.Compression;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

/// <summary>
/// Broken and hostile files: a right read or a typed error that names file and place, in bounded memory. A fault names its
/// case, and the same case can be run again by itself.
/// </summary>
public sealed class HostileTests
{
    /// <summary>One small file of every compression, predictor, arrangement of samples, byte order and container.</summary>
    private static readonly (string Name, byte[] Bytes)[] Own = [.. OwnFixtures()];

    [NeedsFact(Needs.RealDataNeed)]
    public void Collected_broken_files_are_read_or_refused()
    {
        using TemporaryFolder folder = new();
        List<(string Name, byte[] Bytes)> files = [.. Directory.GetFiles(RealData.File("bad"), "*.tif").Select(p => (Path.GetFileName(p), File.ReadAllBytes(p)))];
        using (FileStream packed = File.OpenRead(RealData.File("bad", "image-tiff_fuzz_images.tar.gz")))
        using (GZipStream unpacked = new(packed, CompressionMode.Decompress))
        using (TarReader tar = new(unpacked))
        {
            while (tar.GetNextEntry() is { } entry)
            {
                if (entry.DataStream is not { } data)
                    continue;
                using MemoryStream bytes = new();
                data.CopyTo(bytes);
                files.Add((entry.Name, bytes.ToArray()));
            }
        }

        Assert.Equal(144, files.Count);
        int refused = 0;
        foreach ((string name, byte[] bytes) in files)
        {
            foreach (bool salvage in (bool[])[false, true])
                refused += Try(folder, name, bytes, salvage) is null ? 0 : 1;
        }

        Assert.InRange(refused, files.Count, 2 * files.Count);
    }

    [Fact]
    public void Own_files_cut_at_every_boundary_are_refused_or_read_right()
    {
        using TemporaryFolder folder = new();
        foreach ((string name, byte[] bytes) in Own)
            CutEverywhere(folder, name, bytes, int.MaxValue);
    }

    [NeedsFact(Needs.RealDataNeed)]
    public void Real_files_cut_at_boundaries_are_refused_or_read_right()
    {
        using TemporaryFolder folder = new();
        foreach (string path in Directory.GetFiles(RealData.File("format")).Concat(Directory.GetFiles(RealData.File("micro"))).Order(StringComparer.Ordinal))
            CutEverywhere(folder, Path.GetFileName(path), File.ReadAllBytes(path), 90);
    }

    [Fact]
    public void Mutated_files_are_read_or_refused()
    {
        using TemporaryFolder folder = new();
        int refused = 0;
        for (int seed = 0; seed < 10_000; seed++)
        {
            (string name, byte[] bytes) = Own[seed % Own.Length];
            refused += Try(folder, $"{name}, seed {seed}", Mutations.Of(bytes, seed), seed % 3 == 0) is null ? 0 : 1;
        }

        Assert.InRange(refused, 2000, 9500);
    }

    [NeedsFact(Needs.RealDataNeed)]
    public void Mutated_variants_of_real_files_are_read_or_refused()
    {
        using TemporaryFolder folder = new();
        (string Name, byte[] Bytes)[] files = [.. Directory.GetFiles(RealData.File("format")).Order(StringComparer.Ordinal).Select(p => (Path.GetFileName(p), File.ReadAllBytes(p)))];
        for (int seed = 0; seed < 3000; seed++)
        {
            (string name, byte[] bytes) = files[seed % files.Length];
            Try(folder, $"{name}, seed {seed}", Mutations.Of(bytes, seed), seed % 3 == 0);
        }
    }

    /// <summary>A BigTIFF file of 64 GiB of nothing, whose one page claims a table of 10^9 strips; its sparse bytes are all there.</summary>
    [Theory]
    [InlineData(1_000_000_000)]
    [InlineData(250_000_000)]
    public void Tables_of_a_milliard_strips_are_refused_before_they_are_read(long strips)
    {
        using TemporaryFolder folder = new();
        TinyPage page = TinyFiles.Page(1, 1, 8) with
        {
            Extra = [new(256, 4, 1), new(257, 4, strips), new(278, 4, 1), new(273, 16, 0), new(279, 4, 0)],
        };
        byte[] bytes = TinyTiff.Build(true, false, page);
        foreach (int tag in (int[])[273, 279])
        {
            int entry = bytes.AsSpan().IndexOf((ReadOnlySpan<byte>)[(byte)tag, (byte)(tag >> 8), (byte)(tag == 273 ? 16 : 4), 0]);
            BitConverter.TryWriteBytes(bytes.AsSpan(entry + 4), strips);
            BitConverter.TryWriteBytes(bytes.AsSpan(entry + 12), 4096L);
        }

        string path = TinyFiles.Write(folder, bytes);
        using (FileStream file = File.OpenWrite(path))
            file.SetLength(64L << 30);
        StacksException? refusal = Bounded.Run("milliard", "in.tif", () => Exercise(path, false));
        Assert.Contains("cut into more than", refusal!.Message, StringComparison.Ordinal);
    }

    [Fact]
    public void A_mountain_of_frames_on_a_few_bytes_is_refused()
    {
        // 300 pages of 65,535 samples a pixel, each of which claims the 65,535 bytes that follow it.
        using TemporaryFolder folder = new();
        TinyPage last = TinyFiles.Page(1, 1, 8, perPixel: 65535);
        TinyPage more = TinyFiles.Page(1, 1, 8) with { Extra = [new(277, 3, 65535), new(279, 4, 65535)] };
        byte[] bytes = TinyTiff.Build(false, false, [.. Enumerable.Repeat(more, 300), last]);
        Assert.Contains("lie over each other", Try(folder, "frames", bytes, false)!.Message, StringComparison.Ordinal);
    }

    /// <summary>
    /// A Zstandard frame of run-length blocks (RFC 8878, section 3.1.1.2.2) is 2 MiB in 68 bytes: more than the strip it is
    /// put into may hold.
    /// </summary>
    [Fact]
    public void A_Zstandard_bomb_is_bounded_by_its_segment()
    {
        using TemporaryFolder folder = new();
        List<byte> bomb = [0x28, 0xB5, 0x2F, 0xFD, 0x00, 0x58];
        for (int block = 0; block < 16; block++)
        {
            int header = (131072 << 3) | (1 << 1) | (block == 15 ? 1 : 0);
            bomb.AddRange([(byte)header, (byte)(header >> 8), (byte)(header >> 16), 7]);
        }

        byte[] whole = new byte[16 * 131072];
        Assert.Null(Zstd.Decode([.. bomb], whole, whole.Length));
        Assert.All(whole, b => Assert.Equal(7, b));
        long before = GC.GetAllocatedBytesForCurrentThread();
        foreach (int longest in (int[])[100, 1000])
            Assert.Contains("longer than the page", Zstd.Decode([.. bomb], new byte[100], longest), StringComparison.Ordinal);
        Assert.InRange(GC.GetAllocatedBytesForCurrentThread() - before, 0, 65536);
    }

    private static StacksException? Try(TemporaryFolder folder, string name, byte[] bytes, bool salvage)
    {
        string path = TinyFiles.Write(folder, bytes);
        StacksException? refusal = Bounded.Run(name, "in.tif", () => Exercise(path, salvage));
        if (refusal is StackFormatException)
        {
            Assert.True(
                refusal.Message.Contains("in.tif, page ", StringComparison.Ordinal) || refusal.Message.Contains("in.tif, byte ", StringComparison.Ordinal) || refusal.Message.Contains("thumbnails only", StringComparison.Ordinal),
                $"{name}: {refusal.Message}");
        }

        return refusal;
    }

    /// <summary>Everything a run and an inspection ask of a reader.</summary>
    private static void Exercise(string path, bool salvage)
    {
        using IStackReader reader = new TiffFormat().Open(path, new ReadOptions { AllowTruncated = salvage });
        _ = reader.Parts;
        _ = reader.Facts;
        ByteBuffer raw = new(), stored = new();
        for (int f = 0; f < Math.Min(reader.FrameCount, 100); f++)
        {
            reader.Read(f, raw);
            reader.Decode(f, raw.Written, stored.Resize((int)reader.Layout(f).StoredBytes));
        }

        foreach (HealthFinding finding in reader.CheckHealth(CancellationToken.None).Take(20))
            Assert.NotEmpty(finding.Text);
    }

    /// <summary>
    /// Cuts a file at each directory and segment, at its first byte and behind its last, and one byte before and after that.
    /// What is then read without complaint is what the whole file holds; what is salvaged are its frames.
    /// </summary>
    private static void CutEverywhere(TemporaryFolder folder, string name, byte[] bytes, int most)
    {
        string path = TinyFiles.Write(folder, bytes);
        SortedSet<long> cuts = [];
        Dictionary<(int Page, int Sample), byte[]> whole = [];
        try
        {
            using TiffReader reader = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
            cuts.UnionWith(Boundaries(reader).SelectMany(b => new[] { b - 1, b, b + 1 }).Where(c => c >= 0 && c < bytes.Length));
            for (int f = 0; f < reader.FrameCount; f++)
                whole[Place(reader, f)] = TiffLoop.Samples(reader, f);
        }
        catch (StackFormatException)
        {
            return;
        }

        long step = Math.Max(1, cuts.Count / most);
        using FileStream file = new(path, FileMode.Open, FileAccess.Write, FileShare.ReadWrite);
        foreach (long cut in cuts.Reverse().Where((_, i) => i % step == 0))
        {
            file.SetLength(cut);
            Bounded.Run($"{name} cut at {cut}", "in.tif", () =>
            {
                using TiffReader reader = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
                Assert.Equal(whole.Count, reader.FrameCount);
                Same(reader, whole);
            });
            Bounded.Run($"{name} salvaged at {cut}", "in.tif", () =>
            {
                using TiffReader reader = (TiffReader)new TiffFormat().Open(path, new ReadOptions { AllowTruncated = true });
                Assert.True(reader.FrameCount == whole.Count || reader.Losses.Count > 0);
                Same(reader, whole);
            });
        }
    }

    private static void Same(TiffReader reader, Dictionary<(int Page, int Sample), byte[]> whole)
    {
        for (int f = 0; f < reader.FrameCount; f++)
            Assert.True(whole[Place(reader, f)].AsSpan().SequenceEqual(TiffLoop.Samples(reader, f)), $"frame {f}");
    }

    private static (int Page, int Sample) Place(TiffReader reader, int frame)
    {
        int first = frame;
        while (first > 0 && reader.PageNumber(first - 1) == reader.PageNumber(frame))
            first--;
        return (reader.PageNumber(frame), frame - first);
    }

    private static IEnumerable<long> Boundaries(TiffReader reader)
    {
        FileWindow window = new(reader.File);
        SegmentTable table = new(reader.File);
        foreach (Page page in reader.Index.Pages)
        {
            yield return page.Directory;
            yield return page.Directory + TiffDirectory.Read(reader.File, window, page.Directory, "").ByteLength;
            table.Load(page);
            for (int i = 0; i < table.Length; i++)
            {
                yield return table[i].Offset;
                yield return table[i].Offset + table[i].Count;
            }
        }
    }

    private static IEnumerable<(string Name, byte[] Bytes)> OwnFixtures()
    {
        int number = 0;
        foreach (int compression in (int[])[1, 5, 8, 32773, 32946, 50000])
        {
            foreach (int predictor in compression is 1 or 32773 ? (int[])[1] : [1, 2, 3])
            {
                for (int way = 0; way < 4; way++, number++)
                {
                    (SampleType type, int bits, int format) = TinyFiles.Types[predictor == 3 ? 8 + (number % 3) : number % 11];
                    TinyPage page = TinyFiles.Page(17, 9, bits, format, number, way == 0 ? 1 : 1 + (number % 3)) with
                    {
                        Compression = compression,
                        Predictor = predictor,
                        Planar = way == 2,
                        Tile = way == 3 ? (16, 16) : null,
                        RowsPerStrip = 4,
                    };
                    (bool big, bool bigEndian) = ((number & 1) != 0, (number & 2) != 0);
                    yield return ($"compression {compression}, predictor {predictor}, {type}, way {way}, big {big}, big-endian {bigEndian}", TinyTiff.Build(big, bigEndian, page, page with { Extra = [TinyTag.Text(270, "second")] }));
                }
            }
        }
    }
}
