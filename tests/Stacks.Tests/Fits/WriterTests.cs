using System.Buffers.Binary;
using System.IO.Compression;
using System.Text;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>What becomes of headers, masks and ledgers; files are taken apart by <see cref="FitsBytes.Split"/>.</summary>
public class WriterTests
{
    private static readonly FitsFormat Format = new();

    private static readonly string[] OwnKeywords =
        ["STKPROG", "STKTITLE", "STKRECIP", "STKWORK", "STKSRC", "STKSRCSH", "STKFRAME", "STKBRITE", "STKDARK", "STKKEPT", "STKSATUR", "STKMISS", "STKFLXIN", "STKFLXRM", "STKFLXOT"];

    private static List<(List<string> Cards, byte[] Data)> Written(TemporaryFolder folder, IStackReader source, bool mask = false, TypeChange? change = null, SampleFlags flag = SampleFlags.None)
    {
        PassThrough.Run(source, Format, folder.File("out.fits"), mask, flag, change);
        return FitsBytes.Split(File.ReadAllBytes(folder.File("out.fits")));
    }

    private static string Keyword(string card) => card[..8].TrimEnd();

    private static TypeChange ToFloat { get; } = new(SampleType.Float32, (layout, stored) =>
    {
        byte[] floats = new byte[layout.Length * 4];
        for (int i = 0; i < layout.Length; i++)
            BinaryPrimitives.WriteSingleLittleEndian(floats.AsSpan(4 * i), BinaryPrimitives.ReadUInt16LittleEndian(stored.AsSpan(2 * i)));
        return floats;
    });

    [Fact]
    public void Cards_pass_verbatim_and_in_order()
    {
        string[] odd =
        [
            "LONGSTRN= 'OGIP 1.0'", "LONGTEXT= 'begins here &' / more", "CONTINUE  'and ends here'", "HIERARCH LAB DET NAME = 'Second' / detector",
            "COMMENT twice", "", "COMMENT twice", "HISTORY old", "              / section of blanks", "OBJECT  =      'free'/tight", "EXPTIME =  1.50D+01",
            "CRVAL1  =     1.2345678901234567E-5", "NOTE caf\u00e9 in Latin-1", "CRPIX1  = 10", "CD1_1   = -2.77E-4", "HISTORY older", "DATE-OBS= '1999-01-01T00:00:00'",
        ];
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(16, [2, 1], FitsBytes.Shorts(1, 2), odd).Open(folder);
        List<string> cards = Written(folder, source)[0].Cards;
        int first = cards.FindIndex(card => card.TrimEnd() == odd[0]);
        Assert.Equal(odd, cards.Skip(first).Take(odd.Length).Select(card => card.TrimEnd()));
    }

    [Fact]
    public void What_no_longer_holds_is_made_anew_or_left_out()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(
            16, [2, 1], FitsBytes.Shorts(1, 2),
            "DATE    = '1999-01-01' / written then", "DATAMIN = 1", "DATAMAX = 2", "CHECKSUM= 'abc'", "DATASUM = '5'", "EXTEND  = F / no extensions", "OBJECT  = 'X'").Open(folder);
        List<string> cards = Written(folder, source)[0].Cards;
        Assert.Contains("DATE    = '2001-02-03T04:05:06' / written then", cards.Select(card => card.TrimEnd()));
        Assert.Contains(FitsBytes.Card("EXTEND", "T", "no extensions"), cards.Select(card => card.TrimEnd()));
        Assert.Equal(["DATE", "EXTEND", "OBJECT"], cards.Skip(5).Take(3).Select(Keyword));
        foreach (string keyword in new[] { "DATAMIN", "DATAMAX" })
            Assert.DoesNotContain(cards, card => Keyword(card) == keyword);
        foreach (string keyword in new[] { "CHECKSUM", "DATASUM", "DATE", "EXTEND" })
            Assert.Single(cards, card => Keyword(card) == keyword);
    }

    /// <summary>The long string convention (Standard 4.0, section 4.2.1.2) recommends LONGSTRN; fitsverify warns without it.</summary>
    [Fact]
    public void Long_strings_are_announced_once()
    {
        using TemporaryFolder folder = new();
        foreach (string[] cards in new string[][] { [], ["LONGSTRN= 'OGIP 1.0'"] })
        {
            string path = folder.File(new string('n', 90) + cards.Length + ".fits");
            File.WriteAllBytes(path, new FitsBytes().Primary(16, [2, 1], FitsBytes.Shorts(1, 2), cards).ToArray());
            using IStackReader source = Format.Open(path, new ReadOptions());
            List<string> written = Written(folder, source)[0].Cards;
            Assert.Contains(written, card => Keyword(card) == "CONTINUE");
            Assert.Single(written, card => Keyword(card) == "LONGSTRN");
        }
    }

    [Fact]
    public void A_float_result_drops_the_scaling_of_unsigned_integers()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(
            16, [3, 1], FitsBytes.Shorts(-32768, 0, 32767), FitsBytes.Card("BZERO", 32768), FitsBytes.Card("BSCALE", 1), FitsBytes.Card("BLANK", -1), "OBJECT  = 'X'").Open(folder);
        (List<string> cards, byte[] data) = Written(folder, source, change: ToFloat)[0];
        Assert.Contains(FitsBytes.Card("BITPIX", -32), cards.Select(card => card.TrimEnd()));
        Assert.DoesNotContain(cards, card => Keyword(card) is "BZERO" or "BSCALE" or "BLANK");
        Assert.Contains(cards, card => Keyword(card) == "OBJECT");
        Assert.Equal([0f, 32768f, 65535f], Enumerable.Range(0, 3).Select(i => BinaryPrimitives.ReadSingleBigEndian(data.AsSpan(4 * i))));
    }

    [Fact]
    public void An_unsigned_result_gets_its_bzero()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(-32, [2, 1], FitsBytes.Floats(5, 6)).Open(folder);
        TypeChange change = new(SampleType.UInt32, (_, _) => [0, 0, 0, 0, 255, 255, 255, 255]);
        (List<string> cards, byte[] data) = Written(folder, source, change: change)[0];
        Assert.Equal(["SIMPLE", "BITPIX", "NAXIS", "NAXIS1", "NAXIS2"], cards.Take(5).Select(Keyword));
        Assert.Contains(cards, card => card.StartsWith(FitsBytes.Card("BZERO", "2147483648"), StringComparison.Ordinal));
        Assert.Equal([0x80, 0, 0, 0, 0x7F, 0xFF, 0xFF, 0xFF], data);
    }

    [Fact]
    public void Extensions_stay_in_order_and_what_is_not_science_is_carried_to_the_byte()
    {
        byte[] bytes = new FitsBytes()
            .Primary(16, [], [], "DATE    = '1999-01-01'")
            .Hdu([FitsBytes.Text("XTENSION", "TABLE"), "BITPIX  = 8", "NAXIS   = 2", "NAXIS1  = 4", "NAXIS2  = 3", "PCOUNT  = 0", "GCOUNT  = 1", "TFIELDS = 0", "CHECKSUM= 'theirs'", "DATAMAX = 7", ""], "aaaabbbbcccc"u8.ToArray())
            .Image(16, [2, 1], FitsBytes.Shorts(1, 2), FitsBytes.Text("EXTNAME", "SCI"), "DATE    = '1998-01-01'", "DATAMAX = 7")
            .Image(-32, [2, 1], FitsBytes.Floats(1, 2), FitsBytes.Text("EXTNAME", "ERR"), "DATAMAX = 7")
            .Hdu([FitsBytes.Text("XTENSION", "FOREIGN"), "BITPIX  = 16", "NAXIS   = 1", "NAXIS1  = 5", "PCOUNT  = 3", "GCOUNT  = 2"], new byte[32])
            .ToArray();
        using TemporaryFolder folder = new();
        File.WriteAllBytes(folder.File("in.fits"), bytes);
        using IStackReader source = Format.Open(folder.File("in.fits"), new ReadOptions());
        List<(List<string> Cards, byte[] Data)> before = FitsBytes.Split(bytes), after = Written(folder, source, mask: true);
        Assert.Equal(before.Count + 2, after.Count);
        foreach (int carried in new[] { 1, 3, 4 })
            Assert.Equal((string.Concat(before[carried].Cards), Convert.ToHexString(before[carried].Data)), (string.Concat(after[carried].Cards), Convert.ToHexString(after[carried].Data)));
        Assert.Equal(["XTENSION", "BITPIX", "NAXIS", "NAXIS1", "NAXIS2", "PCOUNT", "GCOUNT", "EXTNAME", "DATE", "DATASUM", "CHECKSUM"], after[2].Cards.Where(card => card.Trim().Length > 0).Select(Keyword));
        Assert.Contains("DATE    = '1998-01-01'", after[2].Cards.Select(card => card.TrimEnd()));
        Assert.Contains(after[5].Cards, card => card.StartsWith("EXTNAME = 'CHANGES", StringComparison.Ordinal));
        Assert.Contains(after[6].Cards, card => card.StartsWith("EXTNAME = 'LEDGER", StringComparison.Ordinal));
    }

    [Fact]
    public void A_primary_array_that_is_not_science_is_carried_below_a_new_header()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes()
            .Hdu(["SIMPLE  = T", "BITPIX  = 16", "NAXIS   = 3", "NAXIS1  = 0", "NAXIS2  = 2", "NAXIS3  = 1", "GROUPS  = T", "PCOUNT  = 1", "GCOUNT  = 4"], FitsBytes.Shorts([.. Enumerable.Range(1, 12)]))
            .Image(16, [2, 1], FitsBytes.Shorts(1, 2))
            .Open(folder);
        byte[] before = File.ReadAllBytes(folder.File("in.fits"));
        Written(folder, source);
        byte[] after = File.ReadAllBytes(folder.File("out.fits"));
        int header = (Encoding.Latin1.GetString(after).IndexOf("END" + new string(' ', 77), StringComparison.Ordinal) / 2880 * 2880) + 2880;
        Assert.Equal(before.AsSpan(2880, 2880), after.AsSpan(header, 2880));
        using IStackReader result = Format.Open(folder.File("out.fits"), new ReadOptions());
        Assert.Equal(["random groups", "science"], result.Parts.Take(2).Select(part => part.Role));
        Assert.All(result.CheckHealth(CancellationToken.None), finding => Assert.False(finding.IsProblem, finding.Text));
    }

    [Fact]
    public void A_second_pass_replaces_keywords_and_keeps_history_masks_and_ledgers()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(16, [2, 1], FitsBytes.Shorts(1, 2), "HISTORY oldest").Open(folder);
        List<string> first = Written(folder, source, mask: true)[0].Cards;
        File.Move(folder.File("out.fits"), folder.File("once.fits"));
        using IStackReader once = Format.Open(folder.File("once.fits"), new ReadOptions());
        Assert.Equal(1, once.FrameCount);
        List<(List<string> Cards, byte[] Data)> second = Written(folder, once, mask: true);

        foreach (string keyword in OwnKeywords)
            Assert.Single(second[0].Cards, card => Keyword(card) == keyword);
        Assert.Contains(second[0].Cards, card => card.StartsWith("STKSRC  = 'once.fits'", StringComparison.Ordinal));
        List<string> History(List<string> cards) => cards.Where(card => Keyword(card) == "HISTORY").ToList();
        Assert.Equal(History(first), History(second[0].Cards).Take(History(first).Count));
        Assert.Equal((2 * History(first).Count) - 1, History(second[0].Cards).Count);
        Assert.Equal(
            ["CHANGES 1", "LEDGER 1", "CHANGES 2", "LEDGER 2"],
            second.Skip(1).Select(hdu => $"{Value(hdu.Cards, "EXTNAME")} {Value(hdu.Cards, "EXTVER")}"));
        Assert.InRange(second[0].Cards.Count, 0, first.Count + 72);
    }

    [Fact]
    public void A_replaced_keyword_takes_its_continuation_along()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(16, [2, 1], FitsBytes.Shorts(1, 2)).Open(folder, name: new string('n', 120) + ".fits");
        Assert.Single(Written(folder, source)[0].Cards, card => Keyword(card) == "CONTINUE");
        File.Move(folder.File("out.fits"), folder.File("short.fits"));
        using IStackReader once = Format.Open(folder.File("short.fits"), new ReadOptions());
        Assert.DoesNotContain(Written(folder, once)[0].Cards, card => Keyword(card) == "CONTINUE");
    }

    [Fact]
    public void Provenance_that_does_not_fit_the_header_says_so()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(16, [2, 1], FitsBytes.Shorts(1, 2)).Open(folder);
        using (IStackWriter writer = Format.Create(new WriteRequest { Source = source, Path = folder.File("out.fits"), SampleTypeOf = _ => SampleType.Int16, Created = PassThrough.Created }))
        {
            EncodedFrame encoded = new();
            writer.Encode(0, PassThrough.Stored(source, 0), new byte[2], encoded);
            writer.Write(0, encoded);
            ProvenanceRecord record = PassThrough.Provenance(source) with { Remarks = Enumerable.Range(0, 1000).Select(i => $"Remark {i}.").ToList() };
            writer.Complete(record, []);
            File.Move(writer.Files[0].Partial, writer.Files[0].Final);
        }

        List<string> cards = FitsBytes.Split(File.ReadAllBytes(folder.File("out.fits")))[0].Cards;
        Assert.Contains(cards, card => card.Contains("The header is full", StringComparison.Ordinal));
        Assert.Contains(cards, card => card.Contains("Remark 10.", StringComparison.Ordinal));
        using IStackReader result = Format.Open(folder.File("out.fits"), new ReadOptions());
        Assert.All(result.CheckHealth(CancellationToken.None), finding => Assert.False(finding.IsProblem, finding.Text));
    }

    [Fact]
    public void The_change_mask_holds_every_frames_flags_in_a_tile()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes()
            .Primary(16, [2, 3, 2], FitsBytes.Shorts([.. Enumerable.Range(0, 12)]))
            .Image(16, [4, 1], FitsBytes.Shorts(1, 2, 3, 4)).Open(folder);
        List<(List<string> Cards, byte[] Data)> hdus = Written(folder, source, mask: true, flag: SampleFlags.Saturated | SampleFlags.KeptAsSource);
        List<string> cube = hdus[2].Cards;
        Assert.Equal(("'GZIP_1  '", "8", "3", "2", "3", "2", "1"), (Text(cube, "ZCMPTYPE"), Value(cube, "ZBITPIX"), Value(cube, "ZNAXIS"), Value(cube, "ZTILE1"), Value(cube, "ZTILE2"), Value(cube, "ZNAXIS3"), Value(cube, "ZTILE3")));
        Assert.Equal([0, 34, 34, 34, 34, 34], Tile(hdus[2].Data, 0, 2));
        Assert.Equal([1, 34, 34, 34, 34, 34], Tile(hdus[2].Data, 1, 2));
        Assert.Equal([2, 34, 34, 34], Tile(hdus[3].Data, 0, 1));
        Assert.Equal(("'primary '", "'HDU 1   '", "2"), (Text(cube, "STKOF"), Text(hdus[3].Cards, "STKOF"), Value(hdus[3].Cards, "EXTVER")));
        Assert.Equal(["in.fits", "out.fits"], Directory.GetFiles(folder.Path).Select(Path.GetFileName).Order());
    }

    [Fact]
    public void Giving_up_leaves_the_partial_file_alone()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(16, [2, 1], FitsBytes.Shorts(1, 2)).Open(folder);
        using (IStackWriter writer = Format.Create(new WriteRequest { Source = source, Path = folder.File("out.fits"), SampleTypeOf = _ => SampleType.Int16, Mask = true, Created = PassThrough.Created }))
            Assert.Equal([new OutputFile(folder.File("out.fits.partial"), folder.File("out.fits"))], writer.Files);
        Assert.Equal(["in.fits", "out.fits.partial"], Directory.GetFiles(folder.Path).Select(Path.GetFileName).Order());
    }

    [Fact]
    public void Equal_runs_give_equal_files()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(16, [2, 1], FitsBytes.Shorts(1, 2)).Open(folder);
        PassThrough.Run(source, Format, folder.File("a.fits"), mask: true);
        PassThrough.Run(source, Format, folder.File("b.fits"), mask: true);
        Assert.Equal(File.ReadAllBytes(folder.File("a.fits")), File.ReadAllBytes(folder.File("b.fits")));
    }

    [Fact]
    public void Errors_of_outputs_are_typed()
    {
        using TemporaryFolder folder = new();
        using IStackReader source = new FitsBytes().Primary(16, [1, 1, 2], FitsBytes.Shorts(1, 2)).Open(folder);
        WriteRequest request = new() { Source = source, Path = folder.File("none/out.fits"), SampleTypeOf = _ => SampleType.Int16, Created = PassThrough.Created };
        Assert.Throws<OutputException>(() => Format.Create(request));
        Assert.Throws<OutputException>(() => Format.Create(request with { Path = folder.File("out.fits"), Compression = OutputCompression.Zstd }));
        Assert.Throws<OutputException>(() => Format.Create(request with { Path = folder.File("out.fits"), SampleTypeOf = i => i == 0 ? SampleType.Int16 : SampleType.Float32 }));
    }

    [Fact]
    public void A_full_disk_is_named()
    {
        if (!OperatingSystem.IsLinux())
            return;

        // /dev/full of Linux: every write ends in ENOSPC.
        using PartialFile full = new("/dev/full");
        StackIOException e = Assert.Throws<StackIOException>(() => full.Write(new byte[10], 0));
        Assert.Contains("ENOSPC", e.Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Channel_z_and_time_of_frames_stand_in_the_ledger()
    {
        using TemporaryFolder folder = new();
        (FrameLayout layout, byte[] stored) = ForeignStack.Frame(SampleType.UInt8, 2, 2, 1);
        ForeignStack source = new(
            (layout with { Channel = 1, ChannelName = "DAPI", Z = 3, Time = 9 }, stored),
            (layout with { Channel = 0, ChannelName = "GFP", Z = 4, Time = 9 }, stored));
        (List<string> cards, byte[] data) = Written(folder, source)[1];
        string names = string.Join(' ', cards.Where(card => Keyword(card).StartsWith("TTYPE", StringComparison.Ordinal)).Take(5).Select(card => card[11..19].TrimEnd()));
        Assert.Equal("FRAME CHANNEL CHANNAME Z TIME", names);
        Assert.Equal((0, 1, 3, 9), (Long(data, 0), Long(data, 8), Long(data, 48), Long(data, 56)));
        Assert.Equal("DAPI", Encoding.ASCII.GetString(data, 16, 32).TrimEnd());
    }

    /// <summary>A descriptor of P format is length and offset in the heap, 32 bits each (Standard 4.0, section 7.3.5).</summary>
    private static byte[] Tile(byte[] table, int row, int rows)
    {
        int length = BinaryPrimitives.ReadInt32BigEndian(table.AsSpan(8 * row)), offset = BinaryPrimitives.ReadInt32BigEndian(table.AsSpan((8 * row) + 4));
        using GZipStream tile = new(new MemoryStream(table, (8 * rows) + offset, length), CompressionMode.Decompress);
        using MemoryStream flags = new();
        tile.CopyTo(flags);
        return flags.ToArray();
    }

    private static long Long(byte[] data, int at) => BinaryPrimitives.ReadInt64BigEndian(data.AsSpan(at));

    private static string Text(List<string> cards, string keyword) => cards.Single(card => Keyword(card) == keyword)[10..].Split(" /")[0].TrimEnd();

    private static string Value(List<string> cards, string keyword) => Text(cards, keyword).Trim('\'', ' ');
}
