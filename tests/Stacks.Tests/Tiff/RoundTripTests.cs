using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

public sealed class RoundTripTests
{
    public static TheoryData<bool, bool, OutputCompression> Ways
    {
        get
        {
            TheoryData<bool, bool, OutputCompression> ways = [];
            foreach ((bool big, bool bigEndian) in new[] { (false, false), (false, true), (true, false), (true, true) })
            {
                foreach (OutputCompression compression in (OutputCompression[])[OutputCompression.None, OutputCompression.Deflate, OutputCompression.Zstd])
                    ways.Add(big, bigEndian, compression);
            }

            return ways;
        }
    }

    [Theory]
    [MemberData(nameof(Ways))]
    public void Every_type_comes_back_bit_for_bit_in_its_byte_order_and_container(bool big, bool bigEndian, OutputCompression compression)
    {
        using TemporaryFolder folder = new();
        foreach ((SampleType type, int bits, int format) in TinyFiles.Types)
        {
            // 550 rows of 500 bytes and more make several strips of 256 KiB.
            TinyPage[] pages = [TinyFiles.Page(500, 550, bits, format) with { RowsPerStrip = 550 }, TinyFiles.Page(1, 1, bits, format), TinyFiles.Page(3, 12000, bits, format) with { RowsPerStrip = 12000 }];
            using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(big, bigEndian, pages));
            string path = TiffLoop.Copy(reader, folder.File($"{type}.tif"), compression)[0];
            using TiffReader again = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
            Assert.Equal((big, bigEndian), (again.File.IsBig, again.File.BigEndian));
            Assert.Equal(Scheme(compression), (int)again.Index.Pages[0].Layout.Compression);
            Assert.Equal(compression == OutputCompression.None ? 1 : type.IsInteger() ? 2 : 3, again.Index.Pages[0].Layout.Predictor);
            for (int f = 0; f < pages.Length; f++)
            {
                Assert.Equal(type, again.Layout(f).SampleType);
                Assert.True(pages[f].Samples.AsSpan().SequenceEqual(TiffLoop.Samples(again, f)), $"{type}, page {f}");
                Assert.True(again.Index.Pages[f].Layout.Grid.BytesOf(0) <= 262144);
            }
        }
    }

    /// <summary>Numbers of the Compression field: TIFF 6.0; Adobe's Photoshop TIFF technical notes for Deflate; libtiff's list for Zstandard.</summary>
    private static int Scheme(OutputCompression compression) => compression switch
    {
        OutputCompression.None => 1,
        OutputCompression.Zstd => 50000,
        _ => 8,
    };

    [Fact]
    public void Lossless_is_Deflate()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, TinyFiles.Page()));
        using TiffReader again = (TiffReader)new TiffFormat().Open(TiffLoop.Copy(reader, folder.File("o.tif"), OutputCompression.Lossless)[0], new ReadOptions());
        Assert.Equal(Compression.Deflate, again.Index.Pages[0].Layout.Compression);
    }

    /// <summary>Pages stay pages, samples of a pixel stay such; they are stored in planes.</summary>
    [Theory]
    [MemberData(nameof(Ways))]
    public void Pages_of_several_samples_stay_pages_of_several_samples(bool big, bool bigEndian, OutputCompression compression)
    {
        using TemporaryFolder folder = new();
        TinyTag[] rgb = [new(262, 3, 2)];
        TinyTag[] rgba = [new(262, 3, 2), new(338, 3, 2)];
        TinyPage[] pages =
        [
            TinyFiles.Page(31, 40, 16, 1, 1, 3) with { Extra = rgb }, TinyFiles.Page(31, 40, 8, 2, 2, 4) with { Extra = rgba, Planar = true },
            TinyFiles.Page(31, 40, 32, 3, 3), TinyFiles.Page(31, 40, 64, 3, 4, 2) with { Compression = 8, Predictor = 3 },
        ];
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(big, bigEndian, pages));
        string path = TiffLoop.Copy(reader, folder.File("out.tif"), compression)[0];
        using TiffReader again = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
        Assert.Equal(10, again.FrameCount);
        for (int f = 0; f < 10; f++)
            Assert.Equal(TiffLoop.Samples(reader, f), TiffLoop.Samples(again, f));
        Assert.Equal([3, 4, 1, 2], again.Index.Pages.Select(p => p.Layout.Samples));
        Assert.Equal([2, 2, 0, 0], again.Index.Pages.Select(p => p.Layout.Photometric == 2 ? 2 : 0));
        Assert.Equal([null, 2, null, null], Enumerable.Range(0, 4).Select(p => Fields.Bytes(again, p, 338)?.Max()));
        Assert.Equal([2, 2, 1, 2], Enumerable.Range(0, 4).Select(p => (int)Fields.Bytes(again, p, 284)!.Max()));
    }

    [Fact]
    public void Samples_of_a_pixel_cannot_get_different_types()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, TinyFiles.Page(perPixel: 2)));
        OutputException refusal = Assert.Throws<OutputException>(() => TiffLoop.Copy(reader, folder.File("o.tif"), typeOf: f => f == 0 ? SampleType.UInt16 : SampleType.Float32));
        Assert.Contains("frame 1", refusal.Message, StringComparison.Ordinal);
    }

    /// <summary>A frame of two strips of 256 KiB costs objects, not buffers, once everything has been used before.</summary>
    [Theory]
    [InlineData(OutputCompression.None)]
    [InlineData(OutputCompression.Deflate)]
    [InlineData(OutputCompression.Zstd)]
    public void Coding_a_frame_allocates_nothing_big(OutputCompression compression)
    {
        using TemporaryFolder folder = new();
        foreach (SampleType type in (SampleType[])[SampleType.UInt16, SampleType.Float32])
        {
            FrameLayout layout = new() { Width = 512, Height = 1024 / type.Size(), SampleType = type };
            byte[] samples = TinyTiff.SomeSamples((int)layout.Length, 8 * type.Size(), type == SampleType.Float32 ? 3 : 1, 1);
            LayoutsOnly source = new(layout, 1);
            using TiffWriter writer = new(new WriteRequest { Source = source, Path = folder.File($"{type}.tif"), SampleTypeOf = _ => type, Compression = compression, Created = TiffLoop.Created });
            EncodedFrame encoded = new();
            byte[] work = [.. samples];
            long Once()
            {
                samples.CopyTo(work, 0);
                long before = GC.GetAllocatedBytesForCurrentThread();
                writer.Encode(0, work, [], encoded);
                return GC.GetAllocatedBytesForCurrentThread() - before;
            }

            Once();
            Once();
            Assert.InRange(Once(), 0, 4096);
        }
    }

    [Fact]
    public void A_new_sample_type_is_written()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, true, TinyFiles.Page(), TinyFiles.Page()));
        byte[] floats = TinyTiff.SomeSamples(35, 32, 3, 9);
        string path = TiffLoop.Copy(reader, folder.File("out.tif"), typeOf: _ => SampleType.Float32, change: (_, _) => [.. floats])[0];
        using IStackReader again = new TiffFormat().Open(path, new ReadOptions());
        Assert.Equal(SampleType.Float32, again.Layout(1).SampleType);
        Assert.Equal(floats, TiffLoop.Samples(again, 1));
    }

    [Fact]
    public void Equal_runs_give_equal_files()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, true, TinyFiles.Page(), TinyFiles.Page()));
        Directory.CreateDirectory(folder.File("b"));
        string a = TiffLoop.Copy(reader, folder.File("out.tif"), compression: OutputCompression.Lossless, mask: true)[0];
        string b = TiffLoop.Copy(reader, Path.Combine(folder.File("b"), "out.tif"), compression: OutputCompression.Lossless, mask: true)[0];
        Assert.Equal(File.ReadAllBytes(a), File.ReadAllBytes(b));
    }

    [Fact]
    public void Change_mask_is_a_companion_of_one_byte_a_pixel()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, true, TinyFiles.Page(), TinyFiles.Page()));
        IReadOnlyList<string> files = TiffLoop.Copy(reader, folder.File("night.tif"), mask: true);
        Assert.Equal([folder.File("night.tif"), folder.File("night.changes.tif")], files);
        using TiffReader mask = (TiffReader)new TiffFormat().Open(files[1], new ReadOptions());
        Assert.Equal(2, mask.FrameCount);
        for (int f = 0; f < 2; f++)
        {
            Assert.Equal(SampleType.UInt8, mask.Layout(f).SampleType);
            Assert.True(mask.IsCompressed(f));
            Assert.Equal(Enumerable.Range(0, 35).Select(i => (byte)((i + f) % 7 == 0 ? 8 : 0)), TiffLoop.Samples(mask, f));
        }

        string description = Fields.Text(mask, 0, 270)!;
        foreach (SampleFlags flag in Enum.GetValues<SampleFlags>().Where(f => f is not (SampleFlags.None or SampleFlags.Replaced)))
            Assert.Contains($"{(byte)flag} {flag}", description, StringComparison.Ordinal);
    }

    [Fact]
    public void Fields_are_carried_verbatim_except_those_that_say_how_samples_are_stored()
    {
        using TemporaryFolder folder = new();
        TinyTag[] carried =
        [
            TinyTag.Text(270, "first\nµ"), new(282, 5, 72000, 1000), new(283, 5, 300, 1), new(296, 3, 3), TinyTag.Text(315, "someone"),
            new(50000, 12, 0x400921FB54442D18), new(65001, 3, 1, 2, 3, 4, 5), new(65002, 7, 9, 8, 7, 6, 5, 4, 3),
        ];
        TinyTag[] statistics = [new(280, 3, 1), new(281, 3, 9), new(340, 3, 1), new(341, 3, 9)];
        TinyTag[] first = [TinyTag.Text(305, "maker"), TinyTag.Text(306, "2001:01:01 00:00:00")];
        TinyPage page = TinyFiles.Page() with { Extra = [.. carried, .. statistics, .. first] };
        using TiffReader reader = (TiffReader)TinyFiles.Open(folder, TinyTiff.Build(false, true, page, page, page));
        string path = TiffLoop.Copy(reader, folder.File("out.tif"), change: (f, s) => f == 1 ? [.. s.Select(b => (byte)~b)] : s)[0];
        using TiffReader again = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
        for (int p = 0; p < 3; p++)
        {
            foreach (int tag in carried.Select(t => t.Tag))
                Assert.Equal(Fields.Bytes(reader, p, tag), Fields.Bytes(again, p, tag));
            foreach (int tag in statistics.Select(t => t.Tag))
                Assert.Equal(p == 1 ? null : Fields.Bytes(reader, p, tag), Fields.Bytes(again, p, tag));
            Assert.Equal(p == 0 ? "stacks 0.1.0" : "maker", Fields.Text(again, p, 305));
            Assert.Equal(p == 0 ? "2024:02:03 04:05:06" : "2001:01:01 00:00:00", Fields.Text(again, p, 306));
            Assert.Equal(p == 0, Fields.Bytes(again, p, 700) is not null);
        }
    }

    [Fact]
    public void Thumbnails_are_carried_as_they_stand()
    {
        using TemporaryFolder folder = new();
        byte[] jpeg = [.. Enumerable.Range(0, 40).Select(i => (byte)(i * 7))];
        TinyPage thumbnail = new() { Width = 8, Height = 5, Bits = 8, Samples = jpeg, Extra = [new(254, 4, 1), new(259, 3, 7), new(277, 3, 3), new(262, 3, 6), new(258, 3, 8, 8, 8)] };
        using TiffReader reader = (TiffReader)TinyFiles.Open(folder, TinyTiff.Build(false, true, thumbnail, TinyFiles.Page(), thumbnail, TinyFiles.Page(seed: 2)));
        Assert.Equal(2, reader.FrameCount);
        Assert.Equal(["thumbnail", "science", "thumbnail", "science"], reader.Parts.Select(p => p.Role));
        string path = TiffLoop.Copy(reader, folder.File("out.tif"), compression: OutputCompression.Lossless)[0];
        using TiffReader again = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
        Assert.Equal(["thumbnail", "science", "thumbnail", "science"], again.Parts.Select(p => p.Role));
        Assert.Equal(TinyFiles.Page(seed: 2).Samples, TiffLoop.Samples(again, 1));
        foreach (int p in (int[])[0, 2])
        {
            SegmentTable table = new(again.File);
            table.Load(again.Index.Pages[p]);
            byte[] data = new byte[40];
            for (int i = 0, at = 0; i < table.Length; at += (int)table[i].Count, i++)
                again.File.Read(table[i].Offset, data.AsSpan(at, (int)table[i].Count));
            Assert.Equal(jpeg, data);
        }

        Assert.Throws<StackFormatException>(() => TinyFiles.Open(folder, TinyTiff.Build(false, false, thumbnail)));
    }

    [Fact]
    public void Thumbnails_are_left_out_by_choice_and_named()
    {
        using TemporaryFolder folder = new();
        TinyPage thumbnail = TinyFiles.Page(4, 3) with { Extra = [new(254, 4, 1)] };
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, true, thumbnail, TinyFiles.Page(), thumbnail, TinyFiles.Page(seed: 2)));
        foreach (bool carry in (bool[])[true, false])
        {
            string path = TiffLoop.Copy(reader, folder.File($"{carry}.tif"), carry: carry)[0];
            using TiffReader again = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
            Assert.Equal((2, carry ? 4 : 2), (again.FrameCount, again.Index.Pages.Count));
            Assert.Equal(TinyFiles.Page(seed: 2).Samples, TiffLoop.Samples(again, 1));
            string provenance = Fields.Text(again, 0, 700)!;
            Assert.Equal(!carry, provenance.Contains("not carried: page 0 of the source (thumbnail, 4 x 3)", StringComparison.Ordinal));
            Assert.Equal(!carry, provenance.Contains("not carried: page 2 of the source (thumbnail, 4 x 3)", StringComparison.Ordinal));
        }
    }

    [Fact]
    public void Frames_out_of_order_and_missing_frames_are_faults_of_the_caller()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, TinyFiles.Page(), TinyFiles.Page()));
        using IStackWriter writer = new TiffFormat().Create(new WriteRequest { Source = reader, Path = folder.File("o.tif"), SampleTypeOf = _ => SampleType.UInt16, Created = TiffLoop.Created });
        Assert.Throws<InvalidOperationException>(() => writer.Write(1, new EncodedFrame()));
        Assert.Throws<InvalidOperationException>(() => writer.Complete(TiffLoop.Record(0), []));
    }

    [Fact]
    public void An_output_that_cannot_be_created_is_named()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = TinyFiles.Open(folder, TinyTiff.Build(false, false, TinyFiles.Page()));
        Assert.Throws<OutputException>(() => TiffLoop.Copy(reader, Path.Combine(folder.File("none"), "o.tif")));
    }

    /// <summary>/dev/full fails every write with ENOSPC (Linux, full(4)); no file system holds a file of 2^62 bytes (EFBIG).</summary>
    [Fact]
    public void Full_disks_and_too_large_files_are_named()
    {
        if (!OperatingSystem.IsLinux())
            return;
        using OutputFileStream full = new("/dev/full");
        full.Append(new byte[100]);
        Assert.Contains("No space left", Assert.Throws<StackIOException>(full.Flush).Message, StringComparison.Ordinal);
        using TemporaryFolder folder = new();
        using OutputFileStream large = new(folder.File("large"));
        Assert.Contains("EFBIG", Assert.Throws<StackIOException>(() => large.WriteAt(1L << 62, new byte[1])).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Classic_offsets_beyond_4_GiB_do_not_wrap()
    {
        using TemporaryFolder folder = new();
        using OutputFileStream file = new(folder.File("x"));
        Assert.Throws<StackIOException>(() => new DirectoryWriter(file, false, isBig: false).Offsets(273, [1L << 32]));
        Assert.Equal(16, new DirectoryWriter(file, false, isBig: true).Offsets(273, [1L << 32, 2]).Value.Length);
    }

    [Fact]
    public void BigTIFF_is_chosen_before_4_GiB_are_passed_and_not_earlier()
    {
        using TemporaryFolder folder = new();
        foreach ((int frames, bool big) in ((int, bool)[])[(63, false), (64, true), (1000, true)])
        {
            // 64 MiB a frame as 32-bit floats.
            LayoutsOnly source = new(new FrameLayout { Width = 4096, Height = 4096, SampleType = SampleType.UInt16 }, frames);
            using TiffWriter writer = new(new WriteRequest { Source = source, Path = folder.File("o.tif"), SampleTypeOf = _ => SampleType.Float32, Created = TiffLoop.Created });
            Assert.Equal(big, writer.IsBig);
        }
    }

    /// <summary>FITS frames may have what TIFF has no fields for.</summary>
    [Fact]
    public void A_source_of_another_format_gives_plain_pages()
    {
        using TemporaryFolder folder = new();
        FrameLayout layout = new() { Width = 9, Height = 4, SampleType = SampleType.Int32 };
        string path = TiffLoop.Copy(new LayoutsOnly(layout, 3), folder.File("o.tif"))[0];
        using TiffReader again = (TiffReader)new TiffFormat().Open(path, new ReadOptions());
        Assert.Equal((3, SampleType.Int32, false), (again.FrameCount, again.Layout(2).SampleType, again.File.BigEndian));
        Assert.Null(Fields.Bytes(again, 0, 270));

        Assert.Throws<OutputException>(() => TiffLoop.Copy(new LayoutsOnly(layout with { Transform = new(2, 0) }, 1), folder.File("p.tif")));
        Assert.Throws<OutputException>(() => TiffLoop.Copy(new LayoutsOnly(layout with { Blank = -1 }, 1), folder.File("p.tif")));
        TiffLoop.Copy(new LayoutsOnly(layout with { Blank = -1 }, 1), folder.File("p.tif"), typeOf: _ => SampleType.Float64, change: (_, s) => new byte[2 * s.Length]);
    }
}
