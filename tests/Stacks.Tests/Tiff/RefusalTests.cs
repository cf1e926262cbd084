using System.Buffers.Binary;
using Stacks.Abstractions;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

/// <summary>What is refused is refused by name: where, what, what to do.</summary>
public sealed class RefusalTests
{
    [Theory]
    [InlineData(277, 0, "0 samples per pixel")]
    [InlineData(258, 12, "12-bit integer samples")]
    [InlineData(258, 24, "24-bit integer samples")]
    [InlineData(258, 1, "1-bit integer samples")]
    [InlineData(262, 3, "palette")]
    [InlineData(262, 6, "YCbCr")]
    [InlineData(259, 6, "old-style JPEG")]
    [InlineData(259, 7, "JPEG")]
    [InlineData(259, 4, "CCITT")]
    [InlineData(259, 34712, "compression scheme 34712")]
    [InlineData(266, 2, "FillOrder 2")]
    [InlineData(339, 5, "complex")]
    [InlineData(339, 9, "sample format 9")]
    public void Kinds_are_refused_by_name(int tag, int value, string name)
    {
        StackFormatException refusal = TinyFiles.Refusal(TinyTiff.Build(false, false, TinyFiles.Page(), TinyFiles.Page() with { Extra = [new(tag, 3, value)] }));
        Assert.Contains(name, refusal.Message, StringComparison.Ordinal);
        Assert.Contains("in.tif, page 1, tag " + tag, refusal.Message, StringComparison.Ordinal);
        Assert.DoesNotContain('\n', refusal.Message);
    }

    [Theory]
    [InlineData(8, 16, 1, 4, "predictor 4")]
    [InlineData(8, 16, 1, 3, "floating-point predictor")]
    [InlineData(8, 24, 3, 1, "24-bit floating-point")]
    public void Predictors_and_floats_are_refused_by_name(int compression, int bits, int format, int predictor, string name)
    {
        TinyPage page = TinyFiles.Page(8, 4, 16) with { Compression = compression, Extra = [new(258, 3, bits), new(339, 3, format), new(317, 3, predictor)] };
        Assert.Contains(name, TinyFiles.Refusal(TinyTiff.Build(false, false, page)).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Other_files_are_no_TIFF()
    {
        foreach (byte[] bytes in (byte[][])[[], [0x49], "SIMPLE  =                    T"u8.ToArray(), "II*\0"u8.ToArray(), "II+\0\x04\0\0\0\x10\0\0\0\0\0\0\0"u8.ToArray()])
            Assert.Contains("TIFF", TinyFiles.Refusal(bytes).Message, StringComparison.Ordinal);
        using TemporaryFolder folder = new();
        Assert.Throws<InputMissingException>(() => new Formats.Tiff.TiffFormat().Open(folder.File("none.tif"), new ReadOptions()));
        Assert.Throws<StackIOException>(() => new Formats.Tiff.TiffFormat().Open(folder.Path, new ReadOptions()));
    }

    [Fact]
    public void Extensions_of_a_recipe_are_refused()
    {
        using TemporaryFolder folder = new();
        string path = TinyFiles.Write(folder, TinyTiff.Build(false, false, TinyFiles.Page()));
        Assert.Throws<StackFormatException>(() => new Formats.Tiff.TiffFormat().Open(path, new ReadOptions { Extensions = ["SCI"] }));
    }

    [Theory]
    [InlineData(false, false)]
    [InlineData(true, true)]
    public void Loops_are_found(bool big, bool bigEndian)
    {
        byte[] bytes = TinyTiff.Build(big, bigEndian, TinyFiles.Page(), TinyFiles.Page(), TinyFiles.Page());
        (int first, int second, int third) = Links(bytes, big, bigEndian);
        Array.Copy(bytes, first, bytes, third, big ? 8 : 4);
        StackFormatException refusal = TinyFiles.Refusal(bytes);
        Assert.Contains("leads back", refusal.Message, StringComparison.Ordinal);
        Assert.Contains("page 3", refusal.Message, StringComparison.Ordinal);
        Assert.True(second > first);
    }

    [Theory]
    [InlineData(0xFFFFFFFFFFFFFFF0)]
    [InlineData(0x8000000000000000)]
    [InlineData(0x7FFFFFFFFFFFFFFF)]
    public void Offsets_beyond_63_bits_do_not_wrap(ulong offset)
    {
        byte[] bytes = TinyTiff.Build(true, false, TinyFiles.Page(), TinyFiles.Page());
        (_, int second, _) = Links(bytes, true, false);
        BinaryPrimitives.WriteUInt64LittleEndian(bytes.AsSpan(second), offset);
        Assert.Contains("the file ends at byte", TinyFiles.Refusal(bytes).Message, StringComparison.Ordinal);

        byte[] strip = TinyTiff.Build(true, false, TinyFiles.Page() with { RowsPerStrip = 5 });
        int entry = strip.AsSpan().IndexOf((ReadOnlySpan<byte>)[0x11, 0x01, 16, 0]);
        BinaryPrimitives.WriteUInt64LittleEndian(strip.AsSpan(entry + 12), offset);
        Assert.Contains("the file ends at byte", TinyFiles.Refusal(strip).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Absurd_counts_allocate_nothing()
    {
        // A directory of 2^60 fields, and a field of 2^61 values whose length in bytes wraps to 0 in 64 bits.
        byte[] bytes = TinyTiff.Build(true, false, TinyFiles.Page());
        BinaryPrimitives.WriteUInt64LittleEndian(bytes.AsSpan(16), 1UL << 60);
        Assert.Contains("fields", TinyFiles.Refusal(bytes).Message, StringComparison.Ordinal);

        byte[] field = TinyTiff.Build(true, false, TinyFiles.Page() with { Extra = [new(65000, 16, 1, 2)] });
        int entry = field.AsSpan().IndexOf((ReadOnlySpan<byte>)[0xE8, 0xFD, 16, 0]);
        BinaryPrimitives.WriteUInt64LittleEndian(field.AsSpan(entry + 4), 1UL << 61);
        Assert.Contains("tag 65000", TinyFiles.Refusal(field).Message, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData(256, 2000000000)]
    [InlineData(257, 2000000000)]
    [InlineData(256, 0)]
    [InlineData(257, 0)]
    [InlineData(278, 0)]
    public void Absurd_sizes_are_refused(int tag, int value) =>
        TinyFiles.Refusal(TinyTiff.Build(false, false, TinyFiles.Page() with { Extra = [new(tag, 4, value)] }));

    [Theory]
    [InlineData(5)]
    [InlineData(8)]
    [InlineData(32773)]
    public void Bombs_are_known_before_they_are_read(int compression)
    {
        // 100 bytes cannot be 64 MiB in either scheme.
        TinyPage page = TinyFiles.Page() with { Compression = compression, RowsPerStrip = 100000, Extra = [new(256, 4, 8192), new(257, 4, 4096), new(278, 4, 4096)] };
        Assert.Contains("cannot hold", TinyFiles.Refusal(TinyTiff.Build(false, false, page)).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Overlapping_directories_are_refused()
    {
        // 3000 directories of 4000 fields each that lie over each other, two bytes apart: 144 MB of fields in 60 kB.
        byte[] bytes = new byte[60000];
        "II*\0"u8.CopyTo(bytes);
        BinaryPrimitives.WriteInt32LittleEndian(bytes.AsSpan(4), 8);
        for (int at = 8; at < 6000; at += 2)
            BinaryPrimitives.WriteInt16LittleEndian(bytes.AsSpan(at), 4000);
        Assert.NotNull(TinyFiles.Refusal(bytes));
    }

    [Fact]
    public void Damaged_compressed_data_are_named_with_page_strip_and_byte()
    {
        using TemporaryFolder folder = new();
        TinyPage page = TinyFiles.Page(40, 40) with { Compression = 8, RowsPerStrip = 20 };
        byte[] bytes = TinyTiff.Build(false, false, page, page);
        bytes[^20] ^= 0x55;
        using IStackReader reader = TinyFiles.Open(folder, bytes);
        Assert.Equal(page.Samples, TiffLoop.Samples(reader, 0));
        StackFormatException damage = Assert.Throws<StackFormatException>(() => TiffLoop.Samples(reader, 1));
        Assert.Contains("page 1, strip 1, byte", damage.Message, StringComparison.Ordinal);
        Assert.Contains(reader.CheckHealth(default), f => f.IsProblem && f.Text == damage.Message);
    }

    /// <summary>Places of the links to the second page and so on, found by walking as TIFF 6.0 says.</summary>
    private static (int First, int Second, int Third) Links(byte[] bytes, bool big, bool bigEndian)
    {
        long Number(int at, int size)
        {
            long value = 0;
            for (int b = 0; b < size; b++)
                value = (value << 8) + bytes[at + (bigEndian ? b : size - 1 - b)];
            return value;
        }

        int[] links = new int[3];
        int link = big ? 8 : 4;
        for (int i = 0; i < 3 && Number(link, big ? 8 : 4) != 0; i++)
        {
            int directory = (int)Number(link, big ? 8 : 4);
            link = directory + (big ? 8 : 2) + ((int)Number(directory, big ? 8 : 2) * (big ? 20 : 12));
            links[i] = link;
        }

        return (links[0], links[1], links[2]);
    }
}
