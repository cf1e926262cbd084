using System.Text;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Broken and hostile files: a typed error that names the place, or a right read; nothing is allocated on a header's word.</summary>
public class HostileTests
{
    private static readonly FitsFormat Format = new();

    private static string[] Named(string name) => [FitsBytes.Text("EXTNAME", name)];

    /// <summary>A cube of 5 frames over 3 blocks, an extension of 1 frame, a mask, a table.</summary>
    private static byte[] Whole { get; } = new FitsBytes()
        .Primary(16, [30, 20, 5], new byte[30 * 20 * 5 * 2])
        .Image(8, [60, 60], new byte[3600], Named("SECOND"))
        .Image(8, [60, 60], new byte[3600], Named("MASK"))
        .Hdu([FitsBytes.Text("XTENSION", "BINTABLE"), FitsBytes.Card("BITPIX", 8), FitsBytes.Card("NAXIS", 2), FitsBytes.Card("NAXIS1", 100), FitsBytes.Card("NAXIS2", 50), FitsBytes.Card("PCOUNT", 0), FitsBytes.Card("GCOUNT", 1), FitsBytes.Card("TFIELDS", 0)], new byte[5000])
        .ToArray();

    private static IStackReader Open(TemporaryFolder folder, byte[] bytes, bool allowTruncated = false)
    {
        File.WriteAllBytes(folder.File("in.fits"), bytes);
        return Format.Open(folder.File("in.fits"), new ReadOptions { AllowTruncated = allowTruncated });
    }

    public static IEnumerable<int> Cuts => Enumerable.Range(0, Whole.Length / 2880).SelectMany(block => new[] { (block * 2880) - 1, block * 2880, (block * 2880) + 1, (block * 2880) + 1000 }).Where(cut => cut >= 0);

    /// <summary>The data units by hand: header of a block each, 6000 bytes, 3600, 3600, 5000.</summary>
    private static readonly (int Header, int Data, int Bytes, int FrameBytes)[] Units =
        [(0, 2880, 6000, 1200), (11520, 14400, 3600, 3600), (20160, 23040, 3600, 0), (28800, 31680, 5000, 0)];

    [Fact]
    public void A_file_cut_anywhere_is_refused_unless_only_padding_or_whole_hdus_are_gone()
    {
        Assert.Equal(37440, Whole.Length);
        using TemporaryFolder folder = new();
        foreach (int cut in Cuts)
        {
            // A header is known by its first 9 characters; what ends before them is padding or stray bytes.
            bool isWhole = cut >= Units[0].Data && !Units.Any(unit => cut >= unit.Header + 9 && cut < unit.Data + unit.Bytes);
            try
            {
                using IStackReader reader = Open(folder, Whole[..cut]);
                Assert.True(isWhole, $"cut at {cut} was not noticed");
                Assert.Equal(Units.Where(unit => unit.FrameBytes > 0 && cut >= unit.Data + unit.Bytes).Sum(unit => unit.Bytes / unit.FrameBytes), reader.FrameCount);
                for (int frame = 0; frame < reader.FrameCount; frame++)
                    PassThrough.Stored(reader, frame);
                if (cut % 2880 != 0)
                    Assert.Contains(reader.CheckHealth(CancellationToken.None), finding => finding.IsProblem);
            }
            catch (StackFormatException e)
            {
                Assert.False(isWhole, $"cut at {cut}: {e.Message}");
                Assert.Contains(cut < 9 ? "not FITS" : "ends", e.Message, StringComparison.Ordinal);
            }
        }
    }

    [Fact]
    public void A_truncated_file_gives_its_whole_frames_on_request()
    {
        using TemporaryFolder folder = new();
        foreach (int cut in Cuts)
        {
            int frames = Units.Where(unit => unit.FrameBytes > 0 && cut > unit.Data).Sum(unit => Math.Min(cut - unit.Data, unit.Bytes) / unit.FrameBytes);
            if (frames == 0)
            {
                Assert.Throws<StackFormatException>(() => Open(folder, Whole[..cut], allowTruncated: true));
                continue;
            }

            using IStackReader reader = Open(folder, Whole[..cut], allowTruncated: true);
            Assert.Equal(frames, reader.FrameCount);
            for (int frame = 0; frame < reader.FrameCount; frame++)
                PassThrough.Stored(reader, frame);
            if (Units.Any(unit => cut > unit.Data && cut < unit.Data + unit.Bytes))
                Assert.Contains(reader.CheckHealth(CancellationToken.None), finding => finding.IsProblem && finding.Text.Contains("truncated", StringComparison.Ordinal));
        }
    }

    [Fact]
    public void A_truncated_cube_names_frame_and_byte()
    {
        using TemporaryFolder folder = new();
        StackFormatException e = Assert.Throws<StackFormatException>(() => Open(folder, Whole[..(2880 + 2500)]));
        Assert.Contains("frame 2 at byte 5280", e.Message, StringComparison.Ordinal);
        Assert.Contains("ends at byte 5380", e.Message, StringComparison.Ordinal);
    }

    [Fact]
    public void A_truncated_stack_is_written_as_its_whole_frames()
    {
        using TemporaryFolder folder = new();
        using (IStackReader reader = Open(folder, Whole[..(2880 + 2500)], allowTruncated: true))
            PassThrough.Run(reader, Format, folder.File("out.fits"));
        using IStackReader result = Format.Open(folder.File("out.fits"), new ReadOptions());
        Assert.Equal(2, result.FrameCount);
        List<string> cards = FitsBytes.Split(File.ReadAllBytes(folder.File("out.fits")))[0].Cards;
        Assert.Contains(cards, card => card.StartsWith("NAXIS3  =                    2", StringComparison.Ordinal));
        Assert.Contains(cards, card => card.StartsWith("HISTORY", StringComparison.Ordinal) && card.Contains("truncated", StringComparison.Ordinal));
    }

    public static TheoryData<string, string> Headers => new()
    {
        { "NAXIS", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 999|NAXIS1  = 2|NAXIS2  = 2" },
        { "NAXIS", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 1000|NAXIS1  = 2" },
        { "NAXIS", "SIMPLE  = T|BITPIX  = 16|NAXIS   = -1" },
        { "NAXIS", "SIMPLE  = T|BITPIX  = 16" },
        { "NAXIS", "SIMPLE  = T|BITPIX  = 16|NAXIS   = two" },
        { "NAXIS = 1", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 1|NAXIS1  = 100" },
        { "NAXIS2", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 2|NAXIS1  = 2|NAXIS2  = -2" },
        { "NAXIS2", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 2|NAXIS1  = 2" },
        { "NAXIS1", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 2|NAXIS1  = 99999999999999999999|NAXIS2  = 2" },
        { "NAXISn", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 2|NAXIS1  = 9223372036854775807|NAXIS2  = 9223372036854775807" },
        { "NAXISn", "SIMPLE  = T|BITPIX  = 64|NAXIS   = 2|NAXIS1  = 4294967296|NAXIS2  = 536870912" },
        { "2 GiB", "SIMPLE  = T|BITPIX  = 64|NAXIS   = 2|NAXIS1  = 4294967295|NAXIS2  = 4" },
        { "2 GiB", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 2|NAXIS1  = 100000|NAXIS2  = 100000" },
        { "truncated", "SIMPLE  = T|BITPIX  = 16|NAXIS   = 3|NAXIS1  = 30000|NAXIS2  = 30000|NAXIS3  = 1000000000" },
        { "BITPIX", "SIMPLE  = T|BITPIX  = 12|NAXIS   = 2|NAXIS1  = 2|NAXIS2  = 2" },
        { "BITPIX", "SIMPLE  = T|BITPIX  = -16|NAXIS   = 2|NAXIS1  = 2|NAXIS2  = 2" },
        { "BITPIX", "SIMPLE  = T|NAXIS   = 2|NAXIS1  = 2|NAXIS2  = 2" },
        { "SIMPLE", "SIMPLE  = F|BITPIX  = 8|NAXIS   = 2|NAXIS1  = 2|NAXIS2  = 2" },
        { "random groups", "SIMPLE  = T|BITPIX  = 8|NAXIS   = 2|NAXIS1  = 0|NAXIS2  = 2|GROUPS  = T|PCOUNT  = 1|GCOUNT  = 10" },
        { "no science frame", "SIMPLE  = T|BITPIX  = 8|NAXIS   = 0" },
        { "no science frame", "SIMPLE  = T|BITPIX  = 8|NAXIS   = 2|NAXIS1  = 777777701|NAXIS2  = 0" },
    };

    [Theory]
    [MemberData(nameof(Headers))]
    public void Hostile_headers_are_refused_by_name(string named, string header)
    {
        using TemporaryFolder folder = new();
        byte[] bytes = new FitsBytes().Hdu(header.Split('|'), new byte[2880]).ToArray();
        StackFormatException e = Assert.Throws<StackFormatException>(() => Open(folder, bytes));
        Assert.Contains(named, e.Message, StringComparison.Ordinal);
        Assert.DoesNotContain('\n', e.Message);
    }

    [Theory]
    [InlineData("BINTABLE", 9223372036854775807, 1)]
    [InlineData("BINTABLE", 0, 9223372036854775807)]
    [InlineData("BINTABLE", -5, 1)]
    [InlineData("IMAGE", 7, 1)]
    [InlineData("IMAGE", 0, 2)]
    public void Hostile_group_counts_are_refused(string extension, long pcount, long gcount)
    {
        using TemporaryFolder folder = new();
        byte[] bytes = new FitsBytes().Primary(16, [2, 2], new byte[8])
            .Hdu([FitsBytes.Text("XTENSION", extension), "BITPIX  = 8", "NAXIS   = 2", "NAXIS1  = 4", "NAXIS2  = 4", $"PCOUNT  = {pcount}", $"GCOUNT  = {gcount}", "TFIELDS = 0"], new byte[2880])
            .ToArray();
        Assert.Throws<StackFormatException>(() => Open(folder, bytes));
    }

    [Fact]
    public void A_file_that_is_not_fits_is_told_apart()
    {
        using TemporaryFolder folder = new();
        Assert.Contains("not FITS", Assert.Throws<StackFormatException>(() => Open(folder, Encoding.ASCII.GetBytes(new string('x', 5000)))).Message, StringComparison.Ordinal);
        Assert.Contains("not FITS", Assert.Throws<StackFormatException>(() => Open(folder, [])).Message, StringComparison.Ordinal);
        Assert.Contains("END", Assert.Throws<StackFormatException>(() => Open(folder, [.. "SIMPLE  =                    T"u8, .. new byte[5000]])).Message, StringComparison.Ordinal);
        Assert.Throws<InputMissingException>(() => Format.Open(folder.File("absent.fits"), new ReadOptions()));
        Assert.Throws<StackIOException>(() => Format.Open(folder.Path, new ReadOptions()));
    }

    [Fact]
    public void A_header_without_end_is_bounded()
    {
        using TemporaryFolder folder = new();
        string card = "COMMENT on and on".PadRight(80);
        StringBuilder text = new("SIMPLE  =                    T".PadRight(80));
        for (int i = 0; i < 400_000; i++)
            text.Append(card);
        Assert.Contains("END", Assert.Throws<StackFormatException>(() => Open(folder, Encoding.ASCII.GetBytes(text.ToString()))).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void A_gzipped_file_is_recognised()
    {
        using TemporaryFolder folder = new();
        using MemoryStream packed = new();
        using (System.IO.Compression.GZipStream gzip = new(packed, System.IO.Compression.CompressionLevel.Optimal, leaveOpen: true))
            gzip.Write(Whole);
        byte[] bytes = packed.ToArray();
        Assert.True(Format.Recognises(bytes.AsSpan(0, Math.Min(4096, bytes.Length))));
        Assert.Contains("the gzip stream is damaged", Assert.Throws<StackFormatException>(() => Open(folder, bytes[..3])).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Files_are_recognised_by_their_first_bytes()
    {
        Assert.True(Format.Recognises(Whole.AsSpan(0, 2880)));
        Assert.True(Format.Recognises("SIMPLE  ="u8));
        Assert.False(Format.Recognises("SIMPLE"u8));
        Assert.False(Format.Recognises([]));
        Assert.False(Format.Recognises("II*\0"u8));
        Assert.False(Format.Recognises([0x1F, 0x8B]));
        Assert.False(Format.Recognises([0x1F, 0x8B, 8, 0, 0, 0, 0, 0, 0, 3, 1, 2, 3]));
    }

    [Fact]
    public void Broken_headers_never_give_anything_but_a_typed_error_or_frames()
    {
        using TemporaryFolder folder = new();
        Random random = new(11);
        int opened = 0;
        for (int trial = 0; trial < 1500; trial++)
        {
            byte[] bytes = (byte[])Whole.Clone();
            foreach ((int header, _, _, _) in Units)
            {
                if (random.Next(3) == 0)
                    bytes[header + random.Next(9 * 80)] = (byte)random.Next(trial % 2 == 0 ? 256 : 80);
                if (random.Next(3) == 0)
                    bytes[header + (random.Next(9) * 80) + random.Next(10, 32)] = (byte)"0123456789-E.'/ T"[random.Next(17)];
            }

            try
            {
                using IStackReader reader = Open(folder, bytes, allowTruncated: trial % 3 == 0);
                opened++;
                for (int frame = 0; frame < Math.Min(reader.FrameCount, 8); frame++)
                {
                    PassThrough.Stored(reader, frame);
                    reader.NoiseOf(frame);
                    FrameLayout layout = reader.Layout(frame);
                    reader.MarkQuality(frame, new Plane<SampleFlags>(new SampleFlags[layout.Length], layout.Width, layout.Height));
                }

                Assert.NotEmpty(reader.CheckHealth(CancellationToken.None));
            }
            catch (StacksException)
            {
            }
        }

        Assert.InRange(opened, 100, 1400);
    }

    [NeedsTheory(Needs.RealDataNeed)]
    [InlineData("bad/group_invalid.fits", "no science frame")]
    [InlineData("bad/hopper_naxis_zero.fits", "no science frame")]
    [InlineData("bad/zerowidth.fits", "no science frame")]
    [InlineData("astro/random_groups.fits", "random groups")]
    public void Real_files_without_frames_are_refused(string name, string named) =>
        Assert.Contains(named, Assert.Throws<StackFormatException>(() => Format.Open(RealData.File(name), new ReadOptions())).Message, StringComparison.Ordinal);

    [Fact]
    public void A_file_that_becomes_shorter_is_a_typed_error()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = Open(folder, Whole);
        using (FileStream file = new(folder.File("in.fits"), FileMode.Open, FileAccess.Write, FileShare.ReadWrite))
            file.SetLength(4000);
        Assert.Contains("byte 4000", Assert.Throws<StackFormatException>(() => reader.Read(0, new ByteBuffer())).Message, StringComparison.Ordinal);
    }
}
