using System.Buffers.Binary;
using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Formats.Fits.Tiles;
using Xunit;

namespace Stacks.Tests.FitsTiles;

/// <summary>Streams that are cut, changed or made up: a sentence or some pixels, and never a write beyond the tile.</summary>
public class DamagedTileTests
{
    [Fact]
    public void Pixel_lists_by_hand()
    {
        // FITS Standard 4.0, section 10.4.3: 3 zeros; the high value is 5; 2 of it; 2 zeros and then it; up by 4; one more by 1.
        byte[] stream = Words(0, 7, -100, 13, 0, 0, 0, 0x0003, 0x2004, 0x4002, 0x5003, 0x2004, 0x6001);
        int[] pixels = new int[12];
        Assert.Null(PlioCode.Decode(stream, pixels));
        Assert.Equal([0, 0, 0, 5, 5, 0, 0, 5, 10, 0, 0, 0], pixels);

        // The older header, whose third word is the length; a high value of 28 bits.
        Assert.Null(PlioCode.Decode(Words(0, 0, 6, 0x1001, 0x0002, 0x4003), pixels));
        Assert.Equal([8193, 8193, 8193, 0], pixels[..4]);
        Assert.Contains("more than 12 pixels", PlioCode.Decode(Words(0, 0, 4, 0x400D), pixels), StringComparison.Ordinal);
        Assert.Contains("no instruction", PlioCode.Decode(Words(0, 0, 4, 0x800D - 65536), pixels), StringComparison.Ordinal);
        Assert.Contains("inside an instruction", PlioCode.Decode(Words(0, 0, 4, 0x1001), pixels), StringComparison.Ordinal);
        Assert.Contains("from word 3 to word 9 of 4", PlioCode.Decode(Words(0, 0, 9, 0x4001), pixels), StringComparison.Ordinal);
        Assert.Contains("inside its header", PlioCode.Decode(Words(0, 7, -100, 9), pixels), StringComparison.Ordinal);
    }

    /// <summary>
    /// Tiles of 7 x 5 and 60 x 1 pixels that astropy 5.2.1 (cfitsio's code) compressed, and what went in: another's word on
    /// what the streams say.
    /// </summary>
    private static readonly string HcompressStream =
        "dd9900000005000000070000000000000000000001400b0a0af43de81e6201e623d8fd5fff7c40f09003f91e17fdec7b1ff7b1eefe9f3ca0608805ac8ffbd8f63fef"
        + "60180058050244343fef63d8ffbd8f6c10bdc01107d06900bbe018d700";

    private static readonly int[] HcompressPixels =
    [
        68, 27, 54, 45, 46, 48, 32,
        48, 42, 80, 52, 47, 47, 44,
        41, 46, 54, 900, 59, 48, 50,
        64, 55, 45, 48, 55, 67, 48,
        48, 59, 42, 47, 58, 55, -300,
    ];

    private const string PlioStream = "00000007ff9c001500000000000020020005400411700011500c60011005000000084014700120014009";

    private static readonly int[] PlioPixels =
    [
        0, 0, 0, 0, 0, 3, 3, 3, 3, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 70000, 70001, 0, 0, 0, 0, 0, 0, 0, 0,
        5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 4, 5, 5, 5, 5, 5, 5, 5, 5, 5,
    ];

    [Fact]
    public void A_whole_stream_gives_its_pixels_and_a_cut_one_is_named()
    {
        CheckCuts(Convert.FromHexString(HcompressStream), HcompressPixels, (stream, pixels) => HcompressCode.Decode(stream, 7, false, pixels));
        CheckCuts(Convert.FromHexString(PlioStream), PlioPixels, (stream, pixels) => PlioCode.Decode(stream, pixels));
    }

    /// <summary>Half of a flip's harm is in what comes behind it: each one is decoded to its end, in a tile between two guards.</summary>
    [Fact]
    public void A_stream_with_any_one_bit_changed_gives_pixels_or_a_sentence()
    {
        CheckFlips(Convert.FromHexString(HcompressStream), HcompressPixels.Length, (stream, pixels) => HcompressCode.Decode(stream, 7, false, pixels));
        CheckFlips(Convert.FromHexString(HcompressStream), HcompressPixels.Length, (stream, pixels) => HcompressCode.Decode(stream, 7, true, pixels));
        CheckFlips(Convert.FromHexString(PlioStream), PlioPixels.Length, (stream, pixels) => PlioCode.Decode(stream, pixels));
        ByteBuffer gzip = new();
        GzipTile.Encode(MemoryMarshal.AsBytes(HcompressPixels.AsSpan()), gzip);
        CheckFlips(gzip.Written.ToArray(), HcompressPixels.Length, (stream, pixels) => GzipTile.Decode(stream, MemoryMarshal.AsBytes(pixels)));
    }

    [Fact]
    public void Random_streams_of_every_code()
    {
        Random random = new(5);
        for (int trial = 0; trial < 20_000; trial++)
        {
            byte[] stream = new byte[random.Next(120)];
            random.NextBytes(stream);
            int width = random.Next(1, 12), height = random.Next(1, 12);
            int[] pixels = new int[width * height];
            PlioCode.Decode(stream, pixels);
            PlioCode.Decode([.. Words(0, 0, 3 + (stream.Length / 2)), .. stream], pixels);
            HcompressCode.Decode([.. HcompressHeader(width, height, random), .. stream], width, trial % 2 == 0, pixels);
            RiceCode.Decode(stream, random.Next(1, 40), pixels.AsSpan());
        }
    }

    [Fact]
    public void Other_sizes_inside_a_stream_are_named()
    {
        Assert.Contains("says 5 x 4 pixels, the tile has 4 x 5", HcompressCode.Decode(HcompressHeader(5, 4, new Random(1)), 4, false, new int[20]), StringComparison.Ordinal);
        Assert.Contains("does not begin", HcompressCode.Decode(new byte[30], 4, false, new int[20]), StringComparison.Ordinal);
    }

    [Fact]
    public void Gzip_tiles_hold_exactly_their_samples()
    {
        byte[] bytes = [.. Enumerable.Range(0, 240).Select(i => (byte)(i * i))];
        ByteBuffer stream = new();
        GzipTile.Encode(bytes, stream);
        byte[] whole = stream.Written.ToArray(), decoded = new byte[bytes.Length];

        Assert.Null(GzipTile.Decode(whole, decoded));
        Assert.Equal(bytes, decoded);
        Assert.Contains("more than 239", GzipTile.Decode(whole, new byte[239]), StringComparison.Ordinal);
        Assert.Contains("240 bytes, not 241", GzipTile.Decode(whole, new byte[241]), StringComparison.Ordinal);
        for (int length = 0; length < whole.Length; length++)
            Assert.NotNull(GzipTile.Decode(whole.AsSpan(0, length), decoded));
    }

    [Theory]
    [InlineData(1)]
    [InlineData(2)]
    [InlineData(4)]
    [InlineData(8)]
    public void Shuffling_by_hand(int size)
    {
        byte[] bytes = [.. Enumerable.Range(0, 3 * size).Select(i => (byte)i)], shuffled = new byte[bytes.Length], back = new byte[bytes.Length];
        GzipTile.Shuffle(bytes, size, shuffled);
        GzipTile.Unshuffle(shuffled, size, back);

        Assert.Equal(from b in Enumerable.Range(0, size) from i in Enumerable.Range(0, 3) select (byte)((i * size) + b), shuffled);
        Assert.Equal(bytes, back);
    }

    private delegate string? DecodeTile(ReadOnlySpan<byte> stream, Span<int> pixels);

    private static void CheckCuts(byte[] stream, int[] expected, DecodeTile decode)
    {
        int[] pixels = new int[expected.Length];
        Assert.Null(decode(stream, pixels));
        Assert.Equal(expected, pixels);
        for (int length = 0; length < stream.Length; length++)
            Assert.True(decode(stream.AsSpan(0, length), pixels) is not null, $"cut at {length} of {stream.Length}");
    }

    private static void CheckFlips(byte[] stream, int count, DecodeTile decode)
    {
        const int guard = 0x5A5A5A5A;
        for (int bit = 0; bit < 8 * stream.Length; bit++)
        {
            int[] pixels = new int[count + 2];
            (pixels[0], pixels[^1]) = (guard, guard);
            byte[] changed = [.. stream];
            changed[bit / 8] ^= (byte)(128 >> (bit % 8));
            string? problem = decode(changed, pixels.AsSpan(1, count));
            Assert.True(problem is null || problem.Length > 0);
            Assert.Equal((guard, guard), (pixels[0], pixels[^1]));
        }
    }

    private static byte[] HcompressHeader(int width, int height, Random random)
    {
        byte[] header = new byte[25];
        header[0] = 0xDD;
        header[1] = 0x99;
        BinaryPrimitives.WriteInt32BigEndian(header.AsSpan(2), height);
        BinaryPrimitives.WriteInt32BigEndian(header.AsSpan(6), width);
        BinaryPrimitives.WriteInt32BigEndian(header.AsSpan(10), random.Next(4) == 0 ? random.Next() : random.Next(20));
        BinaryPrimitives.WriteInt64BigEndian(header.AsSpan(14), random.NextInt64());
        for (int i = 22; i < 25; i++)
            header[i] = (byte)random.Next(random.Next(20) == 0 ? 256 : 8);
        return header;
    }

    private static byte[] Words(params int[] words) => [.. words.SelectMany(w => new[] { (byte)(w >> 8), (byte)w })];
}
