using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Every sample type, with its ends, comes back to the bit.</summary>
public class RoundTripTests
{
    private static readonly FitsFormat Format = new();

    private static void AssertSame(ForeignStack before, IStackReader after)
    {
        Assert.Equal(before.FrameCount, after.FrameCount);
        for (int frame = 0; frame < before.FrameCount; frame++)
        {
            FrameLayout expected = before.Layout(frame), actual = after.Layout(frame);
            Assert.Equal((expected.Width, expected.Height, expected.SampleType, expected.Transform, expected.Blank, expected.Unit), (actual.Width, actual.Height, actual.SampleType, actual.Transform, actual.Blank, actual.Unit));
            Assert.Equal(PassThrough.Stored(before, frame), PassThrough.Stored(after, frame));
        }

        Assert.All(after.CheckHealth(CancellationToken.None), finding => Assert.False(finding.IsProblem, finding.Text));
    }

    [Theory]
    [MemberData(nameof(SampleEncodingTests.Types), MemberType = typeof(SampleEncodingTests))]
    public void Frames_of_another_format_become_a_cube_and_come_back(SampleType type)
    {
        using TemporaryFolder folder = new();

        // 7 x 5 samples: planes of 35 bytes, and of 70, start at odd and half words of the checksum.
        ForeignStack source = new(ForeignStack.Frame(type, 7, 5, 1), ForeignStack.Frame(type, 7, 5, 2), ForeignStack.Frame(type, 7, 5, 3));
        PassThrough.Run(source, Format, folder.File("cube.fits"), mask: true);
        using IStackReader cube = Format.Open(folder.File("cube.fits"), new ReadOptions());
        AssertSame(source, cube);

        // And once more, now with a FITS source.
        PassThrough.Run(cube, Format, folder.File("again.fits"), mask: true);
        using IStackReader again = Format.Open(folder.File("again.fits"), new ReadOptions());
        AssertSame(source, again);
    }

    [Fact]
    public void A_single_frame_becomes_a_plain_image()
    {
        using TemporaryFolder folder = new();
        PassThrough.Run(new ForeignStack(ForeignStack.Frame(SampleType.UInt16, 7, 5, 1)), Format, folder.File("out.fits"));
        List<string> cards = FitsBytes.Split(File.ReadAllBytes(folder.File("out.fits")))[0].Cards;
        Assert.Contains(FitsBytes.Card("NAXIS", 2), cards.Select(card => card.Split(" /")[0].TrimEnd()));
        Assert.DoesNotContain(cards, card => card.StartsWith("NAXIS3", StringComparison.Ordinal));
    }

    [Fact]
    public void Frames_that_are_not_alike_become_extensions()
    {
        using TemporaryFolder folder = new();
        (FrameLayout layout, byte[] stored) = ForeignStack.Frame(SampleType.Int16, 7, 5, 2);
        ForeignStack source = new(
            ForeignStack.Frame(SampleType.UInt16, 7, 5, 1),
            (layout with { Transform = new ValueTransform(-0.25, 3), Blank = -32768, Unit = "count" }, stored),
            ForeignStack.Frame(SampleType.Float64, 4, 9, 3));
        PassThrough.Run(source, Format, folder.File("out.fits"), mask: true);
        using IStackReader result = Format.Open(folder.File("out.fits"), new ReadOptions());
        AssertSame(source, result);
        Assert.Equal("FRAME,2", result.Layout(1).Extension);
    }

    [Theory]
    [InlineData(SampleType.UInt16, 32768 + 32767)] // BLANK as stored in the file is shifted back
    [InlineData(SampleType.Int8, -1)]
    public void Blank_of_shifted_types(SampleType type, int blank)
    {
        using TemporaryFolder folder = new();
        (FrameLayout layout, byte[] stored) = ForeignStack.Frame(type, 7, 5, 2);
        ForeignStack source = new((layout with { Blank = blank }, stored));
        PassThrough.Run(source, Format, folder.File("out.fits"));
        using IStackReader result = Format.Open(folder.File("out.fits"), new ReadOptions());
        AssertSame(source, result);
    }

    [Theory]
    [InlineData(8)]
    [InlineData(16)]
    [InlineData(32)]
    [InlineData(64)]
    [InlineData(-32)]
    [InlineData(-64)]
    public void The_data_unit_of_a_fits_source_is_written_to_the_bit_whatever_its_scaling(int bitPix)
    {
        string[][] scalings =
        [
            [],
            [FitsBytes.Card("BSCALE", "-0.5"), FitsBytes.Card("BZERO", "7.25")],
            [FitsBytes.Card("BZERO", "32768"), FitsBytes.Card("BSCALE", "1")],
            [FitsBytes.Card("BZERO", "-128")],
            [FitsBytes.Card("BZERO", "2147483648")],
            [FitsBytes.Card("BZERO", "9223372036854775808")],
            bitPix > 0 ? [FitsBytes.Card("BLANK", 5)] : [],
        ];
        using TemporaryFolder folder = new();
        foreach (string[] scaling in scalings)
        {
            byte[] data = new byte[3 * 5 * 4 * Math.Abs(bitPix) / 8];
            new Random(bitPix).NextBytes(data);
            using IStackReader source = new FitsBytes().Primary(bitPix, [3, 5, 4], data, scaling).Open(folder);
            PassThrough.Run(source, Format, folder.File("out.fits"));
            (List<string> cards, byte[] written) = FitsBytes.Split(File.ReadAllBytes(folder.File("out.fits")))[0];
            Assert.Equal(data, written);
            Assert.Equal(scaling, cards.Where(card => card.StartsWith("BSCALE", StringComparison.Ordinal) || card.StartsWith("BZERO", StringComparison.Ordinal) || card.StartsWith("BLANK", StringComparison.Ordinal)).Select(card => card.TrimEnd()));
        }
    }

    [Fact]
    public void Frames_are_read_by_many_threads_at_once()
    {
        using TemporaryFolder folder = new();
        (FrameLayout, byte[])[] frames = Enumerable.Range(0, 40).Select(i => ForeignStack.Frame(SampleType.UInt16, 31, 17, i)).ToArray();
        PassThrough.Run(new ForeignStack(frames), Format, folder.File("out.fits"));
        using IStackReader reader = Format.Open(folder.File("out.fits"), new ReadOptions());
        Parallel.For(0, 400, i => Assert.Equal(frames[i % 40].Item2, PassThrough.Stored(reader, i % 40)));
    }

    [Fact]
    public void Frames_beyond_4_gib_are_found()
    {
        // A sparse file: only its header and its last block take room on the disk.
        using TemporaryFolder folder = new();
        string path = new FitsBytes().Primary(16, [2000, 2000, 700], []).Save(folder);
        const long planeBytes = 2000 * 2000 * 2;
        long end = 2880 + (700 * planeBytes);
        using (FileStream file = new(path, FileMode.Open))
        {
            file.Position = end - 2;
            file.Write([0x12, 0x34]);
        }

        using IStackReader reader = Format.Open(path, new ReadOptions());
        Assert.Equal(700, reader.FrameCount);
        byte[] last = PassThrough.Stored(reader, 699);
        Assert.Equal([0x34, 0x12], last[^2..]);
        Assert.Equal(0, PassThrough.Stored(reader, 698).Max());
    }

    [Fact]
    public void Half_floats_are_refused_with_the_reason()
    {
        Assert.Contains("16-bit", Format.CannotStore(SampleType.Float16), StringComparison.Ordinal);
        Assert.All(Enum.GetValues<SampleType>().Where(type => type != SampleType.Float16), type => Assert.Null(Format.CannotStore(type)));
    }
}
