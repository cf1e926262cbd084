using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Tests.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.FitsTiles;

/// <summary>Compressed files that are cut or damaged: right frames or a typed error, within bounds of time and memory.</summary>
public class HostileTileTests
{
    private static readonly FitsFormat Format = new();

    /// <summary>A cube of 4 frames of 30 x 20 in tiles of whole planes, and an extension of one frame of 25 x 9; each tile a gzip stream.</summary>
    private static readonly byte[][] Tiles = [.. Enumerable.Range(0, 5).Select(i => TiledBytes.Gzip(Random(i < 4 ? 1200 : 450, i)))];

    private static byte[] Random(int length, int seed)
    {
        byte[] bytes = new byte[length];
        new Random(seed).NextBytes(bytes);
        return bytes;
    }

    private static byte[] Whole { get; } = Make();

    private static byte[] Make()
    {
        (string[] cube, byte[] cubeData) = new TiledBytes().Column("COMPRESSED_DATA", "1PB", Tiles[..4]).Hdu(16, [30, 20, 4], [30, 20, 1], "GZIP_1");
        (string[] second, byte[] secondData) = new TiledBytes().Column("COMPRESSED_DATA", "1QB", Tiles[4]).Hdu(16, [25, 9], [25, 9], "GZIP_1");
        return new FitsBytes().Primary(8, [], []).Hdu(cube, cubeData).Hdu(second, secondData).ToArray();
    }

    /// <summary>Headers of one block each: the table of the cube begins at 5760, its heap 32 bytes on.</summary>
    private const int CubeData = 5760, CubeHeap = CubeData + 32;

    private static byte[] Expected(int frame) => [.. Random(frame < 4 ? 1200 : 450, frame).Chunk(2).SelectMany(sample => sample.Reverse())];

    private static IStackReader Open(TemporaryFolder folder, byte[] bytes, bool allowTruncated = false)
    {
        File.WriteAllBytes(folder.File("in.fits"), bytes);
        return Format.Open(folder.File("in.fits"), new ReadOptions { AllowTruncated = allowTruncated });
    }

    [Fact]
    public void A_file_cut_anywhere_is_refused_or_gives_its_whole_frames_on_request()
    {
        using TemporaryFolder folder = new();
        int cubeEnd = CubeHeap + Tiles[..4].Sum(tile => tile.Length);
        int secondHeader = (cubeEnd + 2879) / 2880 * 2880, secondEnd = secondHeader + 2880 + 16 + Tiles[4].Length;
        for (int cut = 2880; cut < Whole.Length; cut += cut is > CubeData - 3 and < CubeHeap + 3 ? 1 : 97)
        {
            // A header is known by its first 9 characters; what ends before them is padding or stray bytes.
            bool isWhole = (cut >= cubeEnd && cut < secondHeader + 9) || cut >= secondEnd || cut < 2880 + 9;
            int frames = Enumerable.Range(1, 4).Count(n => cut >= CubeHeap + Tiles[..n].Sum(tile => tile.Length)) + (cut >= secondEnd ? 1 : 0);
            if (isWhole && frames > 0)
            {
                using IStackReader reader = Open(folder, Whole[..cut]);
                Assert.Equal(frames, reader.FrameCount);
            }
            else
            {
                Assert.Contains("in.fits", Assert.Throws<StackFormatException>(() => Open(folder, Whole[..cut])).Message, StringComparison.Ordinal);
            }

            if (frames == 0)
            {
                Assert.Throws<StackFormatException>(() => Open(folder, Whole[..cut], allowTruncated: true));
                continue;
            }

            using IStackReader salvaged = Open(folder, Whole[..cut], allowTruncated: true);
            Assert.Equal(frames, salvaged.FrameCount);
            for (int frame = 0; frame < frames; frame++)
                Assert.Equal(Expected(frame), PassThrough.Stored(salvaged, frame));
        }
    }

    [Theory]
    [InlineData(false)]
    [InlineData(true)]
    public void A_truncated_cube_is_written_as_its_whole_frames(bool compress)
    {
        using TemporaryFolder folder = new();
        using (IStackReader reader = Open(folder, Whole[..(CubeHeap + Tiles[0].Length + Tiles[1].Length + 5)], allowTruncated: true))
            PassThrough.Run(reader, Format, folder.File("out.fits"), compress: compress);
        using IStackReader result = Format.Open(folder.File("out.fits"), new ReadOptions());
        Assert.Equal(2, result.FrameCount);
        Assert.Equal(Expected(1), PassThrough.Stored(result, 1));
    }

    [Fact]
    public void A_file_that_becomes_shorter_is_a_typed_error()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, Whole);
        foreach (int length in (int[])[CubeHeap + 100, CubeData + 3, 100])
        {
            using (FileStream file = new(folder.File("in.fits"), FileMode.Open, FileAccess.Write, FileShare.ReadWrite))
                file.SetLength(length);
            Assert.Contains("shorter", Assert.Throws<StackFormatException>(() => reader.Read(0, new ByteBuffer())).Message, StringComparison.Ordinal);
        }
    }

    [Fact]
    public void Raw_bytes_of_another_frame_or_of_none_are_a_typed_error()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, Whole);
        Assert.Throws<StackFormatException>(() => reader.Decode(0, [], new byte[1200]));
    }

    [Fact]
    public void Thousand_mutations_of_each_small_file_give_frames_or_typed_errors()
    {
        using TemporaryFolder folder = new();
        foreach ((string name, byte[] whole, int structure) in Small(folder))
            Mutate(folder, name, whole, structure, 1000);
    }

    [NeedsTheory(Needs.RealDataNeed)]
    [InlineData("m13_rice.fits")]
    [InlineData("m13_gzip.fits")]
    [InlineData("m13_plio.fits")]
    [InlineData("m13_hcomp.fits")]
    [InlineData("m13real_rice.fits")]
    public void Mutations_of_real_files_give_frames_or_typed_errors(string name)
    {
        using TemporaryFolder folder = new();
        Mutate(folder, name, File.ReadAllBytes(RealData.File("astro", name)), 14400, 200);
    }

    private static void Mutate(TemporaryFolder folder, string name, byte[] whole, int structure, int count)
    {
        int refused = 0;
        for (int seed = 0; seed < count; seed++)
        {
            byte[] bytes = Mutations.Of(whole, seed, structure);
            refused += Bounded.Run($"{name}, seed {seed}", "in.fits", () =>
            {
                using IStackReader reader = Open(folder, bytes, allowTruncated: seed % 3 == 0);
                ByteBuffer raw = new();
                for (int frame = 0; frame < Math.Min(reader.FrameCount, 8); frame++)
                {
                    PassThrough.Stored(reader, frame, raw);
                    FrameLayout layout = reader.Layout(frame);
                    reader.MarkQuality(frame, new Plane<SampleFlags>(new SampleFlags[layout.Length], layout.Width, layout.Height));
                }
            }) is null ? 0 : 1;
        }

        Assert.InRange(refused, count / 20, count - (count / 20));
    }

    /// <summary>The file above, and what our writer makes of two cubes: Rice and gzip of floats; with the bytes of their headers.</summary>
    private static IEnumerable<(string Name, byte[] Whole, int Structure)> Small(TemporaryFolder folder)
    {
        yield return ("two tables", Whole, CubeHeap);
        foreach (SampleType type in (SampleType[])[SampleType.UInt16, SampleType.Float32])
        {
            string path = folder.File(type + ".fits");
            ForeignStack source = new(ForeignStack.Frame(type, 31, 17, 1), ForeignStack.Frame(type, 31, 17, 2));
            PassThrough.Run(source, Format, path, compress: true);
            yield return (type.ToString(), File.ReadAllBytes(path), 5760);
        }
    }
}
