using BitMiracle.LibTiff.Classic;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

public sealed class CodecTests
{
    [Theory]
    [InlineData(1)]
    [InlineData(2)]
    [InlineData(4)]
    [InlineData(8)]
    public void Predictors_agree_with_the_slow_oracle_in_both_directions(int size)
    {
        foreach (int samples in (int[])[1, 2, 3, 17, 64])
        {
            byte[] plain = TinyTiff.SomeSamples(samples * 3, 8 * size, 1, samples);
            byte[] differences = TinyTiff.Predicted(plain, samples, size, 2, bigEndian: false);
            byte[] work = [.. plain];
            HorizontalPredictor.Apply(work, samples * size, size);
            Assert.Equal(differences, work);
            HorizontalPredictor.Undo(work, samples * size, size, 1);
            Assert.Equal(plain, work);

            byte[] sorted = TinyTiff.Predicted(plain, samples, size, 3, bigEndian: false);
            FloatingPointPredictor.Apply(work, samples * size, size);
            Assert.Equal(sorted, work);
            FloatingPointPredictor.Undo(work, samples * size, size, 1);
            Assert.Equal(plain, work);
        }
    }

    /// <summary>The example of TIFF 6.0, section 13: 7 7 7 8 8 7 7 6 6 gives Clear 7 258 8 8 258 6 6 End.</summary>
    [Fact]
    public void Lzw_decodes_the_example_of_the_standard()
    {
        byte[] codes = Pack(256, 7, 258, 8, 8, 258, 6, 6, 257);
        byte[] output = new byte[9];
        Assert.Null(Lzw.Decode(codes, output));
        Assert.Equal([7, 7, 7, 8, 8, 7, 7, 6, 6], output);
        Assert.Equal(codes, TinyTiff.Lzw([7, 7, 7, 8, 8, 7, 7, 6, 6]));
    }

    /// <summary>Lengths around which the code width changes (table entries 511, 1023, 2047) and the table is cleared (4094).</summary>
    [Fact]
    public void Lzw_code_widths_change_at_the_right_entry()
    {
        Random random = new(5);
        byte[] noise = new byte[9000];
        random.NextBytes(noise);
        foreach (int edge in (int[])[253, 765, 1789, 3836, 4090, 7680])
        {
            for (int length = edge - 6; length <= edge + 6; length++)
                RoundTrip(noise[..length]);
        }
    }

    [Fact]
    public void Lzw_decodes_runs_and_random_text()
    {
        RoundTrip(new byte[100000]);
        Random random = new(6);
        for (int n = 0; n < 60; n++)
        {
            byte[] data = new byte[random.Next(1, 20000)];
            for (int i = 0; i < data.Length; i++)
                data[i] = (byte)random.Next(1 + (n % 9));
            RoundTrip(data);
        }
    }

    [Fact]
    public void Lzw_never_writes_more_than_asked_and_names_bad_data()
    {
        byte[] data = TinyTiff.Lzw(new byte[5000]);
        byte[] output = new byte[777];
        Assert.Null(Lzw.Decode(data, output));
        Assert.Contains("end after 5000 of 5001", Lzw.Decode(data, new byte[5001]), StringComparison.Ordinal);
        Assert.Contains("end after", Lzw.Decode(data.AsSpan(0, data.Length / 2), new byte[5000]), StringComparison.Ordinal);
        Assert.Contains("end after 0", Lzw.Decode([], new byte[1]), StringComparison.Ordinal);
        Assert.Contains("code 300", Lzw.Decode(Pack(256, 7, 300), new byte[9]), StringComparison.Ordinal);
        Assert.Contains("code 258", Lzw.Decode(Pack(256, 258), new byte[9]), StringComparison.Ordinal);
        Assert.Contains("least significant bit first", Lzw.Decode([0, 1, 2], new byte[9]), StringComparison.Ordinal);
    }

    /// <summary>An independent library (BitMiracle.LibTiff.NET, a port of libtiff) writes LZW with predictor 2 and 3; little-endian, where it is right.</summary>
    [Fact]
    public void Lzw_of_an_independent_library_is_read()
    {
        using TemporaryFolder folder = new();
        foreach ((SampleType type, int bits, int format) in TinyFiles.Types.Where(t => t.Bits <= 32))
        {
            foreach (int predictor in format == 3 ? (int[])[1, 3] : [1, 2])
            {
                if (format == 3 && bits == 16)
                    continue;
                byte[] samples = TinyTiff.SomeSamples(70 * 50, bits, format, 3);
                string path = folder.File($"{type}{predictor}.tif");
                using (BitMiracle.LibTiff.Classic.Tiff tiff = BitMiracle.LibTiff.Classic.Tiff.Open(path, "wl"))
                {
                    tiff.SetField(TiffTag.IMAGEWIDTH, 70);
                    tiff.SetField(TiffTag.IMAGELENGTH, 50);
                    tiff.SetField(TiffTag.BITSPERSAMPLE, bits);
                    tiff.SetField(TiffTag.SAMPLESPERPIXEL, 1);
                    tiff.SetField(TiffTag.SAMPLEFORMAT, (BitMiracle.LibTiff.Classic.SampleFormat)format);
                    tiff.SetField(TiffTag.ROWSPERSTRIP, 7);
                    tiff.SetField(TiffTag.PHOTOMETRIC, Photometric.MINISBLACK);
                    tiff.SetField(TiffTag.COMPRESSION, BitMiracle.LibTiff.Classic.Compression.LZW);
                    if (predictor != 1)
                        tiff.SetField(TiffTag.PREDICTOR, (BitMiracle.LibTiff.Classic.Predictor)predictor);
                    for (int y = 0; y < 50; y++)
                        Assert.True(tiff.WriteScanline(samples[(y * 70 * bits / 8)..((y + 1) * 70 * bits / 8)], y));
                }

                using IStackReader reader = new TiffFormat().Open(path, new ReadOptions());
                Assert.Equal(type, reader.Layout(0).SampleType);
                Assert.Equal(samples, TiffLoop.Samples(reader, 0));
            }
        }
    }

    private static void RoundTrip(byte[] data)
    {
        byte[] output = new byte[data.Length];
        Assert.Null(Lzw.Decode(TinyTiff.Lzw(data), output));
        Assert.True(data.AsSpan().SequenceEqual(output), $"{data.Length} bytes");
    }

    /// <summary>Codes of 9 bits, most significant bit first.</summary>
    private static byte[] Pack(params int[] codes)
    {
        byte[] bytes = new byte[((codes.Length * 9) + 7) / 8];
        for (int i = 0; i < codes.Length * 9; i++)
            bytes[i / 8] |= (byte)(((codes[i / 9] >> (8 - (i % 9))) & 1) << (7 - (i % 8)));
        return bytes;
    }
}
