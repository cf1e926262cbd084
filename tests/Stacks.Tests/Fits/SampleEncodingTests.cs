using System.Buffers.Binary;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>Against sample-by-sample integer arithmetic: stored = data + BZERO (FITS Standard 4.0, table 11).</summary>
public class SampleEncodingTests
{
    public static TheoryData<SampleType> Types =>
    [
        SampleType.UInt8, SampleType.Int8, SampleType.UInt16, SampleType.Int16, SampleType.UInt32, SampleType.Int32,
        SampleType.UInt64, SampleType.Int64, SampleType.Float32, SampleType.Float64,
    ];

    [Theory]
    [MemberData(nameof(Types))]
    public void Decoding_and_encoding_at_every_length(SampleType type)
    {
        Random random = new((int)type);
        int size = type.Size();
        foreach (int count in Enumerable.Range(0, 70).Append(9000).Append(20011))
        {
            byte[] data = new byte[count * size];
            random.NextBytes(data);
            byte[] expected = Oracle(type, data);
            byte[] stored = new byte[data.Length];
            SampleEncoding.Decode(type, data, stored);
            Assert.Equal(expected, stored);

            byte[] back = new byte[data.Length];
            SampleEncoding.Encode(type, stored, back);
            Assert.Equal(data, back);
        }
    }

    [Fact]
    public void The_ends_of_unsigned_ranges()
    {
        byte[] stored = new byte[6];
        SampleEncoding.Decode(SampleType.UInt16, FitsBytes.Shorts(-32768, 0, 32767), stored);
        Assert.Equal([0, 32768, 65535], Enumerable.Range(0, 3).Select(i => (int)BinaryPrimitives.ReadUInt16LittleEndian(stored.AsSpan(2 * i))));
    }

    private static byte[] Oracle(SampleType type, byte[] data)
    {
        int size = type.Size();
        Int128 zero = type switch
        {
            SampleType.Int8 => -128,
            SampleType.UInt16 => 32768,
            SampleType.UInt32 => 2147483648,
            SampleType.UInt64 => 9223372036854775808,
            _ => 0,
        };
        byte[] stored = new byte[data.Length];
        for (int at = 0; at < data.Length; at += size)
        {
            Int128 value = 0;
            for (int i = 0; i < size; i++)
                value = (value << 8) | data[at + i];

            // BITPIX 8 is unsigned, the wider ones are signed.
            if (size > 1 && value >= (Int128)1 << ((8 * size) - 1))
                value -= (Int128)1 << (8 * size);
            value += zero;
            for (int i = 0; i < size; i++)
                stored[at + i] = (byte)(value >> (8 * i));
        }

        return stored;
    }
}
