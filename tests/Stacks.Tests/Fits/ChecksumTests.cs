using System.Buffers.Binary;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

public class ChecksumTests
{
    /// <summary>The sum as the standard defines it, word by word, with the carry brought round at once.</summary>
    private static uint Oracle(byte[] bytes)
    {
        byte[] padded = [.. bytes, .. new byte[(4 - (bytes.Length % 4)) % 4]];
        uint sum = 0;
        for (int at = 0; at < padded.Length; at += 4)
        {
            ulong more = (ulong)sum + BinaryPrimitives.ReadUInt32BigEndian(padded.AsSpan(at));
            sum = more > uint.MaxValue ? (uint)(more - uint.MaxValue) : (uint)more;
        }

        return sum;
    }

    [Fact]
    public void The_standards_example()
    {
        // FITS Standard 4.0, appendix J.5: the sum 868229149 encodes, complemented, to hcHjjc9ghcEghc9g.
        Assert.Equal("hcHjjc9ghcEghc9g", FitsChecksum.Encode(~868229149u));
    }

    [Fact]
    public void Zero_encodes_to_zeros() => Assert.Equal("0000000000000000", FitsChecksum.Encode(0));

    [Fact]
    public void Encoded_values_are_letters_and_digits_that_add_up()
    {
        Random random = new(5);
        for (int i = 0; i < 5000; i++)
        {
            uint value = (uint)random.NextInt64(1L << 32);
            string text = FitsChecksum.Encode(value);
            Assert.All(text, c => Assert.True(char.IsAsciiLetterOrDigit(c), text));

            // Turned back by one place, the four words less '0' in each byte add up to the value (appendix J.2).
            string turned = text[1..] + text[0];
            uint sum = 0;
            for (int word = 0; word < 16; word += 4)
                sum = unchecked(sum + (uint)(((turned[word] - '0') << 24) + ((turned[word + 1] - '0') << 16) + ((turned[word + 2] - '0') << 8) + (turned[word + 3] - '0')));
            Assert.Equal(value, sum);
        }
    }

    [Fact]
    public void Sums_of_all_short_lengths()
    {
        Random random = new(6);
        for (int length = 0; length < 70; length++)
        {
            byte[] bytes = new byte[length];
            random.NextBytes(bytes);
            Assert.Equal(Oracle(bytes), FitsChecksum.Sum(bytes));
            bytes.AsSpan().Fill(0xFF);
            Assert.Equal(Oracle(bytes), FitsChecksum.Sum(bytes));
        }
    }

    [Fact]
    public void A_sum_in_parts_is_the_sum_of_the_whole()
    {
        Random random = new(7);
        byte[] bytes = new byte[1001];
        random.NextBytes(bytes);
        for (int trial = 0; trial < 200; trial++)
        {
            uint sum = 0;
            for (int at = 0; at < bytes.Length;)
            {
                int length = Math.Min(random.Next(1, 40), bytes.Length - at);
                sum = FitsChecksum.AddPart(sum, FitsChecksum.Sum(bytes.AsSpan(at, length)), at);
                at += length;
            }

            Assert.Equal(Oracle(bytes), sum);
        }
    }

    [NeedsFact(Needs.RealDataNeed)]
    public void The_sum_of_a_real_image()
    {
        // DATASUM of its header, written by another program.
        List<(List<string> Cards, byte[] Data)> hdus = FitsBytes.Split(File.ReadAllBytes(RealData.File("astro", "checksum_ngc1316.fits")));
        Assert.Equal(2189405276u, FitsChecksum.Sum(hdus[0].Data));
    }

    [NeedsFact(Needs.RealDataNeed)]
    public void Health_finds_good_and_bad_checksums_of_real_files()
    {
        using IStackReader good = new FitsFormat().Open(RealData.File("astro", "checksum_ngc1316.fits"), new ReadOptions());
        List<HealthFinding> findings = good.CheckHealth(CancellationToken.None).ToList();
        Assert.Equal(4, findings.Count);
        Assert.All(findings, finding => Assert.False(finding.IsProblem, finding.Text));

        using IStackReader bad = new FitsFormat().Open(RealData.File("bad", "checksum_false.fits"), new ReadOptions());
        Assert.Equal(4, bad.CheckHealth(CancellationToken.None).Count(finding => finding.IsProblem));
    }
}
