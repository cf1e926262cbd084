using Stacks.Tests.Cli;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>What is not a frame goes along, or is left out and named, as the user chooses.</summary>
public sealed class CarryTests : IDisposable
{
    private readonly CliBench bench = new();

    public void Dispose() => bench.Dispose();

    /// <summary>A science image, its error plane, a table, and extensions of types that only the standard's registry knows.</summary>
    private static byte[] File => new FitsBytes()
        .Primary(8, [], [])
        .Image(16, [4, 3], FitsBytes.Shorts([.. Enumerable.Range(0, 12)]), FitsBytes.Text("EXTNAME", "SCI"))
        .Image(-32, [4, 3], new byte[48], FitsBytes.Text("EXTNAME", "ERR"))
        .Hdu([FitsBytes.Text("XTENSION", "BINTABLE"), FitsBytes.Card("BITPIX", 8), FitsBytes.Card("NAXIS", 2), FitsBytes.Card("NAXIS1", 2), FitsBytes.Card("NAXIS2", 3), FitsBytes.Card("PCOUNT", 0), FitsBytes.Card("GCOUNT", 1), FitsBytes.Card("TFIELDS", 1), FitsBytes.Text("TFORM1", "1I"), FitsBytes.Text("EXTNAME", "TIMES")], [1, 2, 3, 4, 5, 6])
        .Hdu([FitsBytes.Text("XTENSION", "FOREIGN"), FitsBytes.Card("BITPIX", 8), FitsBytes.Card("NAXIS", 1), FitsBytes.Card("NAXIS1", 5), FitsBytes.Card("PCOUNT", 0), FitsBytes.Card("GCOUNT", 1)], [9, 8, 7, 6, 5])
        .Hdu([FitsBytes.Text("XTENSION", "A3DTABLE"), FitsBytes.Card("BITPIX", 8), FitsBytes.Card("NAXIS", 2), FitsBytes.Card("NAXIS1", 2), FitsBytes.Card("NAXIS2", 1), FitsBytes.Card("PCOUNT", 2), FitsBytes.Card("GCOUNT", 1), FitsBytes.Card("TFIELDS", 0)], [1, 2, 3, 4])
        .ToArray();

    [Fact]
    public void Everything_is_carried_byte_for_byte()
    {
        ToolResult result = bench.Run(bench.Recipe(), bench.Put("a.fits", File));

        Assert.Equal(0, result.ExitCode);
        Assert.DoesNotContain("not carried", result.Output, StringComparison.Ordinal);
        byte[][] source = [.. Hdus(File)], made = [.. Hdus(System.IO.File.ReadAllBytes(Path.Combine(bench.Out, "a.fits")))];
        Assert.Equal(7, made.Length);
        for (int i = 2; i < source.Length; i++)
            Assert.Equal(source[i], made[i]);
    }

    [Fact]
    public void What_is_left_out_is_named_before_and_after()
    {
        string recipe = bench.Recipe("[output]\ncarry = false\n"), stack = bench.Put("a.fits", File);
        const string said = "not carried: ERR (error plane, 4 x 3 BITPIX -32); TIMES (table, 3 rows of 2 bytes); HDU 4 (extension of unknown type, 5 bytes); HDU 5 (table, 1 rows of 2 bytes)";

        Assert.Contains(said, bench.Run(recipe, stack, "--dry-run").Output, StringComparison.Ordinal);
        ToolResult result = bench.Run(recipe, stack);

        Assert.Equal(0, result.ExitCode);
        Assert.Contains(said, result.Output, StringComparison.Ordinal);
        List<(List<string> Cards, byte[] Data)> parts = FitsBytes.Split(System.IO.File.ReadAllBytes(Path.Combine(bench.Out, "a.fits")));
        Assert.Equal(3, parts.Count); // primary, SCI, the ledger
        string history = string.Join('\n', parts[0].Cards);
        foreach (string name in new[] { "ERR of the source: not carried", "TIMES of the source: not carried", "HDU 4 of the source: not carried" })
            Assert.Contains(name, history, StringComparison.Ordinal);
    }

    [Fact]
    public void Another_format_carries_frames_alone_and_says_so()
    {
        ToolResult result = bench.Run(bench.Recipe("[output]\nformat = \"tiff\"\n"), bench.Put("a.fits", File));

        Assert.Equal(0, result.ExitCode);
        Assert.Contains("not carried: ERR (error plane", result.Output, StringComparison.Ordinal);
        Assert.Contains("headers do not go into another format", result.Output, StringComparison.Ordinal);
    }

    /// <summary>Random groups in the primary HDU (Standard 4.0, section 6) before an image extension.</summary>
    [Fact]
    public void Random_groups_are_carried()
    {
        byte[] file = new FitsBytes()
            .Hdu([FitsBytes.Card("SIMPLE", "T"), FitsBytes.Card("BITPIX", 16), FitsBytes.Card("NAXIS", 2), FitsBytes.Card("NAXIS1", 0), FitsBytes.Card("NAXIS2", 2), FitsBytes.Card("GROUPS", "T"), FitsBytes.Card("PCOUNT", 1), FitsBytes.Card("GCOUNT", 3)], FitsBytes.Shorts(1, 2, 3, 4, 5, 6, 7, 8, 9))
            .Image(16, [2, 2], FitsBytes.Shorts(1, 2, 3, 4))
            .ToArray();

        Assert.Equal(0, bench.Run(bench.Recipe(), bench.Put("a.fits", file)).ExitCode);
        (List<string> Cards, byte[] Data) made = FitsBytes.Split(System.IO.File.ReadAllBytes(Path.Combine(bench.Out, "a.fits")))[0];
        Assert.Contains(made.Cards, card => card.StartsWith("GROUPS  =                    T", StringComparison.Ordinal));
        Assert.Equal(FitsBytes.Shorts(1, 2, 3, 4, 5, 6, 7, 8, 9), made.Data[..18]);
    }

    /// <summary>Planes of all axes from the third on are frames, and the result keeps the axes.</summary>
    [Theory]
    [InlineData(5)]
    [InlineData(12)]
    [InlineData(999)]
    public void Any_number_of_axes(int count)
    {
        long[] axes = [.. Enumerable.Range(0, count).Select(i => i < 2 ? 2L : i is 2 or 4 ? 3L : 1L)];
        byte[] file = new FitsBytes().Primary(16, axes, FitsBytes.Shorts([.. Enumerable.Range(0, 36)])).ToArray();

        ToolResult result = bench.Run(bench.Recipe(), bench.Put("a.fits", file));

        Assert.Equal((0, ""), (result.ExitCode, string.Join('\n', result.Error.Split('\n').Where(l => l.StartsWith("stacks:", StringComparison.Ordinal)))));
        Assert.Contains("9 frames of 2 x 2", result.Output, StringComparison.Ordinal);
        (List<string> Cards, byte[] Data) made = FitsBytes.Split(System.IO.File.ReadAllBytes(Path.Combine(bench.Out, "a.fits")))[0];
        Assert.Contains(made.Cards, card => card.StartsWith($"NAXIS   = {count,20}", StringComparison.Ordinal));
        Assert.Equal(FitsBytes.Shorts([.. Enumerable.Range(0, 36)]), made.Data[..72]);
    }

    /// <summary>Header and data of each HDU, by the standard's sizes.</summary>
    private static IEnumerable<byte[]> Hdus(byte[] file) =>
        FitsBytes.Split(file).Select(part => (byte[])[.. System.Text.Encoding.Latin1.GetBytes(string.Concat(part.Cards)), .. part.Data]);
}
