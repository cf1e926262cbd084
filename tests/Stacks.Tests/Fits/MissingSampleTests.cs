using System.Buffers.Binary;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Fits;

/// <summary>
/// Missing samples through a run: BLANK stays BLANK in integers and becomes NaN in floats; NaN and infinities keep
/// their places and bits (FITS Standard 4.0, sections 4.4.2.5 and 5.3).
/// </summary>
public sealed class MissingSampleTests : IDisposable
{
    private const int Width = 9;
    private const int Height = 8;
    private const string AdaptiveMedian = "[noise]\nfrom = \"values\"\nsigma = 5\n[[step]]\nfilter = \"adaptive-median\"\npsf_fwhm = 2\n";
    private static readonly int[] Missing = [0, 8, 30, 31, 71];

    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    /// <summary>BITPIX, stored BLANK, BZERO, BSCALE: signed and unsigned types by their conventions, and a real scaling.</summary>
    public static TheoryData<int, long, string, double> Integers => new()
    {
        { 8, 255, "0", 1 }, { 8, 0, "-128", 1 }, { 16, -32768, "0", 1 }, { 16, 32767, "32768", 1 }, { 16, -5, "100", 0.5 },
        { 32, int.MinValue, "0", 1 }, { 32, int.MinValue, "2147483648", 1 }, { 64, long.MinValue, "0", 1 }, { 64, long.MaxValue, "9223372036854775808", 1 }, { 32, 77, "-3", -2 },
    };

    [Theory]
    [MemberData(nameof(Integers))]
    public void Blank_stays_blank_in_integers_and_becomes_nan_in_floats(int bitPix, long blank, string zero, double scale)
    {
        long[] stored = [.. Enumerable.Range(0, Width * Height).Select(i => Missing.Contains(i) ? blank : 20 + (i % 7))];
        byte[] data = Data(bitPix, stored);
        string path = new FitsBytes().Primary(bitPix, [Width, Height], data,
            FitsBytes.Card("BZERO", zero), FitsBytes.Card("BSCALE", scale), FitsBytes.Card("BLANK", blank)).Save(folder);

        foreach (string recipe in new[] { "", AdaptiveMedian })
        {
            Run(recipe, path);
            (List<string> cards, byte[] same) = Result();
            Assert.Contains(cards, card => card.StartsWith(FitsBytes.Card("BLANK", blank), StringComparison.Ordinal));
            foreach (int i in Missing)
                Assert.Equal(data[Sample(i)], same[Sample(i)]);
            if (recipe.Length == 0)
                Assert.Equal(data, same);

            Run(recipe + "[output]\nsamples = \"float64\"\n", path);
            (cards, byte[] floats) = Result();
            Assert.DoesNotContain(cards, card => card.StartsWith("BLANK", StringComparison.Ordinal) || card.StartsWith("BZERO", StringComparison.Ordinal));
            for (int i = 0; i < stored.Length; i++)
            {
                double value = BinaryPrimitives.ReadDoubleBigEndian(floats.AsSpan(8 * i));
                double expected = Missing.Contains(i) ? double.NaN : (scale * stored[i]) + double.Parse(zero, System.Globalization.CultureInfo.InvariantCulture);
                Assert.Equal(expected, value);
            }
        }

        Range Sample(int i) => (i * bitPix / 8)..((i + 1) * bitPix / 8);
    }

    [Theory]
    [InlineData(-32)]
    [InlineData(-64)]
    public void Nan_and_infinities_keep_their_places_and_bits(int bitPix)
    {
        // Quiet, signalling and negative NaN with payloads, and both infinities.
        ulong[] odd = bitPix == -32
            ? [0x7FC00001, 0x7F800002, 0xFFC12345, 0x7F800000, 0xFF800000]
            : [0x7FF8000000000001, 0x7FF0000000000002, 0xFFF8123456789ABC, 0x7FF0000000000000, 0xFFF0000000000000];
        int size = -bitPix / 8;
        byte[] data = new byte[Width * Height * size];
        for (int i = 0; i < Width * Height; i++)
        {
            Span<byte> at = data.AsSpan(i * size, size);
            int place = Array.IndexOf(Missing, i);
            if (bitPix == -32)
                BinaryPrimitives.WriteUInt32BigEndian(at, place >= 0 ? (uint)odd[place] : BitConverter.SingleToUInt32Bits(20 + (i % 7)));
            else
                BinaryPrimitives.WriteUInt64BigEndian(at, place >= 0 ? odd[place] : BitConverter.DoubleToUInt64Bits(20 + (i % 7)));
        }

        string path = new FitsBytes().Primary(bitPix, [Width, Height], data).Save(folder);
        foreach (string recipe in new[] { "", AdaptiveMedian, "[output]\ncompression = \"lossless\"\n" })
        {
            Run(recipe, path);
            if (recipe.Contains("lossless", StringComparison.Ordinal))
            {
                using Abstractions.IStackReader reader = new Stacks.Formats.Fits.FitsFormat().Open(folder.File("out.fits"), new Abstractions.ReadOptions());
                byte[] stored = PassThrough.Stored(reader, 0);
                Assert.Equal(data, stored.Chunk(size).SelectMany(sample => sample.Reverse()));
            }
            else
            {
                Assert.Equal(data, Result().Data);
            }
        }
    }

    private void Run(string recipe, string path) => HostRun.Of(recipe, path, folder.File("out.fits"));

    private (List<string> Cards, byte[] Data) Result() => FitsBytes.Split(File.ReadAllBytes(folder.File("out.fits")))[0];

    private static byte[] Data(int bitPix, long[] stored)
    {
        byte[] data = new byte[stored.Length * bitPix / 8];
        for (int i = 0; i < stored.Length; i++)
        {
            for (int b = 0; b < bitPix / 8; b++)
                data[(i * bitPix / 8) + b] = (byte)(stored[i] >> (bitPix - 8 - (8 * b)));
        }

        return data;
    }
}
