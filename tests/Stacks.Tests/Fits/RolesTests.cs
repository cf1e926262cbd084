using Stacks.Abstractions;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Roles by EXTNAME (common practice).</summary>
public class RolesTests
{
    private static string[] Named(string name, int? version = null) =>
        version is null ? [FitsBytes.Text("EXTNAME", name)] : [FitsBytes.Text("EXTNAME", name), FitsBytes.Card("EXTVER", version)];

    private static FitsBytes TwoOfEach() => new FitsBytes()
        .Primary(16, [], [])
        .Image(16, [2, 2], FitsBytes.Shorts(1, 2, 3, 4), Named("SCI", 1))
        .Image(-32, [2, 2], FitsBytes.Floats(1, 1, 1, 1), Named("ERR", 1))
        .Image(16, [2, 2], FitsBytes.Shorts(0, 0, 4, 0), Named("DQ", 1))
        .Image(16, [2, 2], FitsBytes.Shorts(5, 6, 7, 8), Named("SCI", 2))
        .Image(16, [2, 2], FitsBytes.Shorts(1, 0, 0, 0), Named("DQ", 2))
        .Image(-32, [2, 2], FitsBytes.Floats(9, 9, 9, 9), Named("AREA"))
        .Image(8, [7], new byte[7], Named("WAVES"))
        .Image(8, [1, 1, 3], new byte[3])
        .Image(-32, [2, 2], FitsBytes.Floats(0, 0, 0, 0), Named("MASK"));

    private static SampleFlags[]? Marked(IStackReader reader, int frame)
    {
        SampleFlags[] flags = new SampleFlags[reader.Layout(frame).Length];
        return reader.MarkQuality(frame, new Plane<SampleFlags>(flags, reader.Layout(frame).Width, reader.Layout(frame).Height)) ? flags : null;
    }

    [Fact]
    public void Where_extensions_are_called_sci_they_are_the_stack()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TwoOfEach().Open(folder);
        Assert.Equal(["SCI,1", "SCI,2"], Enumerable.Range(0, reader.FrameCount).Select(i => reader.Layout(i).Extension));
        Assert.Equal(
            ["empty", "science", "error plane", "quality mask", "science", "quality mask", "other image", "array of one axis", "other image", "other image"],
            reader.Parts.Select(part => part.Role));
        Assert.Equal(["carried", "filtered", "carried", "carried", "filtered", "carried", "carried", "carried", "carried", "carried"], reader.Parts.Select(part => part.Fate));
    }

    [Fact]
    public void Masks_go_with_the_extension_of_their_number()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TwoOfEach().Open(folder);
        Assert.Equal([0, 0, SampleFlags.Missing, 0], Marked(reader, 0)!);
        Assert.Equal([SampleFlags.Missing, 0, 0, 0], Marked(reader, 1)!);
    }

    [Fact]
    public void Masks_without_numbers_go_by_order_and_need_the_shape()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = new FitsBytes()
            .Primary(16, [2, 2], FitsBytes.Shorts(1, 2, 3, 4))
            .Image(16, [2, 2], FitsBytes.Shorts(1, 2, 3, 4), Named("SECOND"))
            .Image(16, [3, 1], FitsBytes.Shorts(1, 2, 3), Named("THIRD"))
            .Image(8, [2, 2], [1, 0, 0, 0], Named("MASK"))
            .Image(8, [2, 2], [0, 1, 0, 0], Named("MASK"))
            .Open(folder);
        Assert.Equal(3, reader.FrameCount);
        Assert.Equal([SampleFlags.Missing, 0, 0, 0], Marked(reader, 0)!);
        Assert.Equal([0, SampleFlags.Missing, 0, 0], Marked(reader, 1)!);
        Assert.Null(Marked(reader, 2));
    }

    [Fact]
    public void A_mask_of_one_plane_is_for_all_frames_and_one_of_as_many_for_each()
    {
        using TemporaryFolder folder = new();
        string zero = FitsBytes.Card("BZERO", 32768);
        using IStackReader one = new FitsBytes()
            .Primary(16, [2, 1, 2], FitsBytes.Shorts(1, 2, 3, 4))
            .Image(16, [2, 1], FitsBytes.Shorts(-32768, 5), [.. Named("BPM"), zero]) // unsigned: stored -32768 is 0
            .Open(folder);
        Assert.Equal([0, SampleFlags.Missing], Marked(one, 0)!);
        Assert.Equal([0, SampleFlags.Missing], Marked(one, 1)!);

        using IStackReader each = new FitsBytes()
            .Primary(16, [2, 1, 2], FitsBytes.Shorts(1, 2, 3, 4))
            .Image(32, [2, 1, 2], [0, 0, 0, 0, 1, 0, 0, 0, 0, 0, 0, 1, 0, 0, 0, 0], Named("quality"))
            .Open(folder, name: "each.fits");
        Assert.Equal([0, SampleFlags.Missing], Marked(each, 0)!);
        Assert.Equal([SampleFlags.Missing, 0], Marked(each, 1)!);
    }

    [Fact]
    public void A_mask_of_another_number_of_planes_is_for_none()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = new FitsBytes()
            .Primary(16, [2, 1, 3], FitsBytes.Shorts(1, 2, 3, 4, 5, 6))
            .Image(8, [2, 1, 2], [1, 1, 1, 1], Named("DQ"))
            .Open(folder);
        Assert.Null(Marked(reader, 0));
        Assert.Equal("quality mask of no frame here", reader.Parts[1].Role);
    }

    [Fact]
    public void A_truncated_stack_keeps_its_mask()
    {
        using TemporaryFolder folder = new();
        byte[] bytes = new FitsBytes()
            .Primary(16, [], [])
            .Image(8, [2, 1, 3], [0, 1, 0, 0, 1, 1], Named("DQ"))
            .Image(16, [2, 1, 3], FitsBytes.Shorts(1, 2, 3, 4, 5, 6), Named("SCI"))
            .ToArray();
        File.WriteAllBytes(folder.File("cut.fits"), bytes[..^(2880 - 9)]);
        using IStackReader reader = new Formats.Fits.FitsFormat().Open(folder.File("cut.fits"), new ReadOptions { AllowTruncated = true });
        Assert.Equal(2, reader.FrameCount);
        Assert.Equal([0, SampleFlags.Missing], Marked(reader, 0)!);
        Assert.Equal([0, 0], Marked(reader, 1)!);
    }

    [Fact]
    public void A_large_mask_is_read_strip_by_strip()
    {
        const int side = 700;
        byte[] mask = new byte[side * side * 2];
        Random random = new(3);
        for (int i = 0; i < 500; i++)
            mask[random.Next(mask.Length)] = (byte)random.Next(1, 256);
        using TemporaryFolder folder = new();
        using IStackReader reader = new FitsBytes()
            .Primary(8, [side, side], new byte[side * side])
            .Image(16, [side, side], mask, Named("DQ"))
            .Open(folder);
        SampleFlags[] expected = Enumerable.Range(0, side * side)
            .Select(i => mask[2 * i] != 0 || mask[(2 * i) + 1] != 0 ? SampleFlags.Missing : SampleFlags.None).ToArray();
        Assert.Equal(expected, Marked(reader, 0)!);
    }

    [Fact]
    public void Flags_that_are_set_already_stay()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TwoOfEach().Open(folder);
        SampleFlags[] flags = [SampleFlags.Saturated, SampleFlags.Saturated, SampleFlags.Saturated, SampleFlags.Defect];
        Assert.True(reader.MarkQuality(0, new Plane<SampleFlags>(flags, 2, 2)));
        Assert.Equal([SampleFlags.Saturated, SampleFlags.Saturated, SampleFlags.Saturated | SampleFlags.Missing, SampleFlags.Defect], flags);
    }

    [Theory]
    [InlineData("SCI", 2)]
    [InlineData("sci", 2)]
    [InlineData("SCI,2", 1)]
    [InlineData("AREA", 1)]
    [InlineData("AREA,1", 1)] // EXTVER is 1 where it is not given (Standard 4.0, section 4.4.2.6)
    [InlineData("HDU 8", 3)] // it has no name
    [InlineData("ERR", 1)] // asked for by name
    public void Extensions_can_be_named(string name, int frames)
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TwoOfEach().Open(folder, new ReadOptions { Extensions = [name] });
        Assert.Equal(frames, reader.FrameCount);
    }

    [Theory]
    [InlineData("SCY")]
    [InlineData("SCI,3")]
    public void An_unknown_name_is_an_error_that_lists_those_there_are(string name)
    {
        using TemporaryFolder folder = new();
        StackFormatException e = Assert.Throws<StackFormatException>(() => TwoOfEach().Open(folder, new ReadOptions { Extensions = [name] }));
        Assert.Contains($"'{name}'", e.Message, StringComparison.Ordinal);
        Assert.Contains("primary; SCI,1; ERR,1; DQ,1; SCI,2; DQ,2; AREA; WAVES; HDU 8; MASK", e.Message, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("WAVES")]
    [InlineData("PRIMARY")]
    public void A_name_of_something_that_is_no_image_is_an_error(string name)
    {
        using TemporaryFolder folder = new();
        StackFormatException e = Assert.Throws<StackFormatException>(() => TwoOfEach().Open(folder, new ReadOptions { Extensions = [name] }));
        Assert.Contains("no image", e.Message, StringComparison.Ordinal);
    }
}
