using System.Numerics;
using Stacks.Formats.Fits.Tiles;
using Xunit;

namespace Stacks.Tests.FitsTiles;

/// <summary>Against a coder that goes bit by bit, written from FITS Standard 4.0, section 10.4.1.</summary>
public class RiceCodeTests
{
    public static TheoryData<int, int> Cases
    {
        get
        {
            TheoryData<int, int> cases = [];
            foreach (int block in new[] { 1, 2, 16, 32, 1000 })
            {
                for (int kind = 0; kind < 6; kind++)
                    cases.Add(block, kind);
            }

            return cases;
        }
    }

    [Theory]
    [MemberData(nameof(Cases))]
    public void Bytes(int block, int kind) => Check<byte>(block, kind);

    [Theory]
    [MemberData(nameof(Cases))]
    public void Shorts(int block, int kind) => Check<short>(block, kind);

    [Theory]
    [MemberData(nameof(Cases))]
    public void Ints(int block, int kind) => Check<int>(block, kind);

    [Theory]
    [InlineData(1)]
    [InlineData(2)]
    [InlineData(4)]
    public void A_stream_cut_or_changed_anywhere_is_named_or_gives_other_pixels(int size)
    {
        switch (size)
        {
            case 1:
                Damage<byte>();
                break;
            case 2:
                Damage<short>();
                break;
            default:
                Damage<int>();
                break;
        }
    }

    [Fact]
    public void A_run_of_zeros_to_the_end_is_named()
    {
        Assert.Contains("ends inside the block", RiceCode.Decode(new byte[] { 0, 5, 0x10, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0 }, 32, new short[40]), StringComparison.Ordinal);
        Assert.Contains("ends inside its first pixel", RiceCode.Decode<int>(new byte[3], 32, new int[4]), StringComparison.Ordinal);
        Assert.Contains("asks for 30 low bits", RiceCode.Decode<int>(new byte[] { 0, 0, 0, 0, 0xF8, 0 }, 32, new int[4]), StringComparison.Ordinal);
    }

    private static void Check<T>(int block, int kind)
        where T : unmanaged, IBinaryInteger<T>, IMinMaxValue<T>
    {
        foreach (int count in new[] { 1, 2, 31, 32, 33, 257 })
        {
            T[] pixels = Pixels<T>(count, kind);
            byte[] stream = new byte[RiceCode.MostBytes<T>(count, block)];
            stream = stream[..RiceCode.Encode<T>(pixels, block, stream)];

            Assert.Equal(pixels, Oracle<T>(stream, block, count));
            T[] decoded = new T[count];
            Assert.Null(RiceCode.Decode(stream, block, decoded.AsSpan()));
            Assert.Equal(pixels, decoded);
        }
    }

    private static void Damage<T>()
        where T : unmanaged, IBinaryInteger<T>, IMinMaxValue<T>
    {
        T[] pixels = Pixels<T>(100, 2), decoded = new T[100];
        byte[] stream = new byte[RiceCode.MostBytes<T>(100, 32)];
        stream = stream[..RiceCode.Encode<T>(pixels, 32, stream)];
        for (int length = 0; length < stream.Length; length++)
            Assert.NotNull(RiceCode.Decode(stream.AsSpan(0, length), 32, decoded.AsSpan()));
        for (int bit = 0; bit < 8 * stream.Length; bit++)
        {
            byte[] changed = [.. stream];
            changed[bit / 8] ^= (byte)(128 >> (bit % 8));
            RiceCode.Decode(changed, 32, decoded.AsSpan());
        }
    }

    /// <summary>Constant, ramp, noise, the ends of the range in turn, single spikes in a flat, all bits random.</summary>
    private static T[] Pixels<T>(int count, int kind)
        where T : unmanaged, IBinaryInteger<T>, IMinMaxValue<T>
    {
        Random random = new(kind);
        return [.. Enumerable.Range(0, count).Select(i => kind switch
        {
            0 => T.CreateTruncating(77),
            1 => T.CreateTruncating(i),
            2 => T.CreateTruncating(100 + random.Next(20)),
            3 => i % 2 == 0 ? T.MinValue : T.MaxValue,
            4 => i % 29 == 28 ? T.MaxValue : T.Zero,
            _ => T.CreateTruncating(random.NextInt64()),
        })];
    }

    private static T[] Oracle<T>(byte[] stream, int blockSize, int count)
        where T : unmanaged, IBinaryInteger<T>
    {
        int size = T.Zero.GetByteCount();
        (int numberBits, int verbatim) = size switch { 1 => (3, 6), 2 => (4, 14), _ => (5, 25) };
        int at = 0;
        int Bit() => (stream[at / 8] >> (7 - (at++ % 8))) & 1;
        BigInteger Number(int bits)
        {
            BigInteger value = 0;
            for (int b = 0; b < bits; b++)
                value = (2 * value) + Bit();
            return value;
        }

        BigInteger last = Number(8 * size);
        List<T> pixels = [];
        while (pixels.Count < count)
        {
            int k = (int)Number(numberBits) - 1;
            for (int i = 0; i < blockSize && pixels.Count < count; i++)
            {
                BigInteger m = 0;
                if (k == verbatim)
                {
                    m = Number(8 * size);
                }
                else if (k >= 0)
                {
                    while (Bit() == 0)
                        m++;
                    m = (m << k) + Number(k);
                }

                last += m.IsEven ? m / 2 : -((m + 1) / 2);
                pixels.Add(T.CreateTruncating(last));
            }
        }

        Assert.Equal((at + 7) / 8, stream.Length);
        return [.. pixels];
    }
}
