using System.Buffers.Binary;
using System.IO.Compression;
using System.Text;

namespace Stacks.Tests.Tiff;

/// <summary>A field of a test page; values are numbers, or bytes for types of one byte.</summary>
internal sealed record TinyTag(int Tag, int Type, params long[] Values)
{
    public static TinyTag Text(int tag, string text) => new(tag, 2, [.. Encoding.UTF8.GetBytes(text + "\0").Select(b => (long)b)]);
}

/// <summary>A page of a test file: samples little-endian, row-major, plane after plane where a pixel has several.</summary>
internal sealed record TinyPage
{
    public required int Width { get; init; }

    public required int Height { get; init; }

    public required int Bits { get; init; }

    /// <summary>SampleFormat: 1 unsigned, 2 signed, 3 float.</summary>
    public int Format { get; init; } = 1;

    public required byte[] Samples { get; init; }

    /// <summary>Samples of a pixel.</summary>
    public int PerPixel { get; init; } = 1;

    /// <summary>Planes are stored one after the other, not side by side.</summary>
    public bool Planar { get; init; }

    public int RowsPerStrip { get; init; } = 3;

    public (int Width, int Height)? Tile { get; init; }

    public int Compression { get; init; } = 1;

    public int Predictor { get; init; } = 1;

    /// <summary>Further fields; they replace fields of the same tag.</summary>
    public TinyTag[] Extra { get; init; } = [];
}

/// <summary>
/// A slow TIFF writer for tests, written from TIFF 6.0, technical note 3 and the BigTIFF extension, apart from the code
/// under test: every directory stands before its page's data.
/// </summary>
internal sealed class TinyTiff(bool big, bool bigEndian)
{
    private readonly List<byte> file = [];

    public static byte[] Build(bool big, bool bigEndian, params TinyPage[] pages)
    {
        TinyTiff tiff = new(big, bigEndian);
        tiff.file.AddRange(bigEndian ? "MM"u8 : "II"u8);
        tiff.file.AddRange(tiff.Number(big ? 43 : 42, 2));
        if (big)
            tiff.file.AddRange(tiff.Number(8, 2).Concat(tiff.Number(0, 2)));
        int link = tiff.file.Count;
        tiff.file.AddRange(tiff.Number(0, big ? 8 : 4));
        foreach (TinyPage page in pages)
            link = tiff.Add(page, link);
        return [.. tiff.file];
    }

    /// <summary>Little-endian samples of a kind, with runs, noise and the ends of the range.</summary>
    public static byte[] SomeSamples(int count, int bits, int format, int seed)
    {
        Random random = new(seed);
        byte[] bytes = new byte[count * bits / 8];
        random.NextBytes(bytes);
        for (int i = 0; i < count; i++)
        {
            Span<byte> sample = bytes.AsSpan(i * bits / 8, bits / 8);
            if (format == 3 && i % 3 != 0)
            {
                double value = (random.NextDouble() - 0.3) * 1000;
                if (bits == 16)
                    BinaryPrimitives.WriteHalfLittleEndian(sample, (Half)value);
                else if (bits == 32)
                    BinaryPrimitives.WriteSingleLittleEndian(sample, (float)value);
                else
                    BinaryPrimitives.WriteDoubleLittleEndian(sample, value);
            }
            else if (i % 5 == 0)
            {
                sample.Fill(i % 2 == 0 ? (byte)0xFF : (byte)0);
            }
            else if (i % 5 == 1 && i > 0)
            {
                bytes.AsSpan((i - 1) * bits / 8, bits / 8).CopyTo(sample);
            }
        }

        return bytes;
    }

    /// <summary>LZW by the pseudo-code of TIFF 6.0, section 13, with a table of strings.</summary>
    public static byte[] Lzw(ReadOnlySpan<byte> data)
    {
        List<bool> bits = [];
        Dictionary<string, int> table = [];
        int width = 9;
        void Write(int code)
        {
            for (int b = width - 1; b >= 0; b--)
                bits.Add(((code >> b) & 1) != 0);
        }

        void Initialise()
        {
            table.Clear();
            for (int i = 0; i < 256; i++)
                table[((char)i).ToString()] = i;
            width = 9;
        }

        Initialise();
        Write(256);
        string omega = "";
        int next = 258;
        foreach (byte k in data)
        {
            string longer = omega + (char)k;
            if (table.ContainsKey(longer))
            {
                omega = longer;
                continue;
            }

            Write(table[omega]);
            table[longer] = next++;
            omega = ((char)k).ToString();

            // "As soon as we add table entry 511, we switch to 10-bit codes"; a Clear goes out when 4094 is added.
            if (next == 512)
                width = 10;
            else if (next == 1024)
                width = 11;
            else if (next == 2048)
                width = 12;
            else if (next == 4095)
            {
                Write(256);
                Initialise();
                next = 258;
            }
        }

        if (omega.Length > 0)
        {
            Write(table[omega]);
            next++;
            if (next is 512 or 1024 or 2048)
                width++;
        }

        Write(257);
        byte[] bytes = new byte[(bits.Count + 7) / 8];
        for (int i = 0; i < bits.Count; i++)
            bytes[i / 8] |= (byte)(bits[i] ? 128 >> (i % 8) : 0);
        return bytes;
    }

    /// <summary>PackBits by TIFF 6.0, section 9: equal bytes from two on as a run, the rest as they are, 128 at most.</summary>
    public static byte[] PackBits(byte[] data)
    {
        List<byte> packed = [];
        for (int at = 0; at < data.Length;)
        {
            int run = 1;
            while (run < 128 && at + run < data.Length && data[at + run] == data[at])
                run++;
            if (run >= 2)
            {
                packed.AddRange([(byte)(257 - run), data[at]]);
                at += run;
                continue;
            }

            int end = at + 1;
            while (end < data.Length && end - at < 128 && !(end + 1 < data.Length && data[end] == data[end + 1]))
                end++;
            packed.Add((byte)(end - at - 1));
            packed.AddRange(data[at..end]);
            at = end;
        }

        return [.. packed];
    }

    /// <summary>The bytes of a segment before compression: predictor and byte order, sample by sample.</summary>
    /// <param name="samples">Rows.</param>
    /// <param name="rowSamples">Samples in a row.</param>
    /// <param name="size">Bytes of a sample.</param>
    /// <param name="predictor">1, 2 or 3.</param>
    /// <param name="bigEndian">Byte order.</param>
    /// <param name="n">Samples of a pixel that stand side by side.</param>
    public static byte[] Predicted(byte[] samples, int rowSamples, int size, int predictor, bool bigEndian, int n = 1)
    {
        List<byte> result = [];
        for (int row = 0; row < samples.Length; row += rowSamples * size)
        {
            List<byte> line = [];
            if (predictor == 3)
            {
                // All most significant bytes of the row first, whatever the byte order of the file.
                for (int significance = size - 1; significance >= 0; significance--)
                {
                    for (int x = 0; x < rowSamples; x++)
                        line.Add(samples[row + (x * size) + significance]);
                }

                for (int i = line.Count - 1; i >= n; i--)
                    line[i] = (byte)((256 + line[i] - line[i - n]) % 256);
            }
            else
            {
                UInt128 modulus = UInt128.One << (8 * size);
                for (int x = 0; x < rowSamples; x++)
                {
                    UInt128 now = Value(samples, row + (x * size), size);
                    UInt128 before = predictor == 2 && x >= n ? Value(samples, row + ((x - n) * size), size) : 0;
                    UInt128 difference = (now + modulus - before) % modulus;
                    byte[] bytes = [.. Enumerable.Range(0, size).Select(b => (byte)(difference >> (8 * b)))];
                    line.AddRange(bigEndian ? bytes.Reverse() : bytes);
                }
            }

            result.AddRange(line);
        }

        return [.. result];
    }

    private static UInt128 Value(byte[] bytes, int at, int size)
    {
        UInt128 value = 0;
        for (int b = size - 1; b >= 0; b--)
            value = (value << 8) + bytes[at + b];
        return value;
    }

    private int Add(TinyPage page, int link)
    {
        int size = page.Bits / 8;
        bool coded = page.Compression != 1;
        List<byte[]> segments = [.. Segments(page, size).Select(s =>
        {
            int chunk = page.Planar ? 1 : page.PerPixel;
            byte[] bytes = Predicted(s.Samples, s.Width * chunk, size, coded ? page.Predictor : 1, bigEndian, chunk);
            return page.Compression switch { 5 => Lzw(bytes), 8 or 32946 => Zlib(bytes), 32773 => PackBits(bytes), 50000 => Zstandard(bytes), _ => bytes };
        })];

        List<TinyTag> tags =
        [
            new(256, 4, page.Width), new(257, 4, page.Height), new(258, 3, [.. Enumerable.Repeat((long)page.Bits, page.PerPixel)]), new(259, 3, page.Compression), new(262, 3, 1),
            new(277, 3, page.PerPixel), new(284, 3, page.Planar ? 2 : 1), new(339, 3, [.. Enumerable.Repeat((long)page.Format, page.PerPixel)]),
        ];
        if (coded && page.Predictor != 1)
            tags.Add(new(317, 3, page.Predictor));
        if (page.Tile is { } tile)
            tags.AddRange([new(322, 3, tile.Width), new(323, 3, tile.Height)]);
        else
            tags.Add(new(278, 4, page.RowsPerStrip));
        (int offsets, int counts) = page.Tile is null ? (273, 279) : (324, 325);
        tags.Add(new(counts, 4, [.. segments.Select(s => (long)s.Length)]));
        tags.Add(new(offsets, big ? 16 : 4, new long[segments.Count]));
        tags.RemoveAll(t => page.Extra.Any(e => e.Tag == t.Tag));
        tags.AddRange(page.Extra);
        tags.Sort((a, b) => a.Tag.CompareTo(b.Tag));

        Pad();
        Patch(link, file.Count, big ? 8 : 4);
        int entries = file.Count + (big ? 8 : 2);
        int end = entries + (tags.Count * (big ? 20 : 12)) + (big ? 8 : 4);
        file.AddRange(Number(tags.Count, big ? 8 : 2));
        file.AddRange(new byte[end - file.Count]);
        int offsetsAt = 0;
        for (int i = 0; i < tags.Count; i++)
        {
            TinyTag tag = tags[i];
            int entry = entries + (i * (big ? 20 : 12));
            int unit = tag.Type switch { 1 or 2 or 6 or 7 => 1, 3 or 8 => 2, 4 or 9 or 11 or 13 => 4, 5 => 4, _ => 8 };
            Patch(entry, tag.Tag, 2);
            Patch(entry + 2, tag.Type, 2);
            Patch(entry + 4, tag.Type == 5 ? tag.Values.Length / 2 : tag.Values.Length, big ? 8 : 4);
            int at = entry + (big ? 12 : 8);
            byte[] value = [.. tag.Values.SelectMany(v => Number(v, unit))];
            if (value.Length > (big ? 8 : 4))
            {
                Pad();
                Patch(at, file.Count, big ? 8 : 4);
                at = file.Count;
                file.AddRange(value);
            }
            else
            {
                for (int b = 0; b < value.Length; b++)
                    file[at + b] = value[b];
            }

            if (tag.Tag == offsets)
                offsetsAt = at;
        }

        foreach (byte[] segment in segments)
        {
            Pad();
            Patch(offsetsAt, file.Count, big ? 8 : 4);
            offsetsAt += big ? 8 : 4;
            file.AddRange(segment);
        }

        return end - (big ? 8 : 4);
    }

    private static IEnumerable<(byte[] Samples, int Width)> Segments(TinyPage page, int size) => page.Planar
        ? Enumerable.Range(0, page.PerPixel).SelectMany(plane => Segments(page, size, plane, 1))
        : Segments(page, size, 0, page.PerPixel);

    private static IEnumerable<(byte[] Samples, int Width)> Segments(TinyPage page, int size, int firstPlane, int planes)
    {
        (int width, int height) = page.Tile ?? (page.Width, page.RowsPerStrip);
        for (int top = 0; top < page.Height; top += height)
        {
            for (int left = 0; left < page.Width; left += width)
            {
                int rows = page.Tile is null ? Math.Min(height, page.Height - top) : height;
                byte[] samples = new byte[rows * width * planes * size];
                for (int y = 0; y < rows && top + y < page.Height; y++)
                {
                    for (int x = 0; x < width && left + x < page.Width; x++)
                    {
                        for (int p = 0; p < planes; p++)
                        {
                            int from = ((((firstPlane + p) * page.Height) + top + y) * page.Width) + left + x;
                            Array.Copy(page.Samples, from * size, samples, ((((y * width) + x) * planes) + p) * size, size);
                        }
                    }
                }

                yield return (samples, width);
            }
        }
    }

    private static byte[] Zstandard(byte[] bytes)
    {
        using ZstdSharp.Compressor compressor = new();
        return compressor.Wrap(bytes).ToArray();
    }

    private static byte[] Zlib(byte[] bytes)
    {
        MemoryStream stream = new();
        using (ZLibStream zlib = new(stream, CompressionLevel.Fastest, leaveOpen: true))
            zlib.Write(bytes);
        return stream.ToArray();
    }

    private void Pad()
    {
        if (file.Count % 2 != 0)
            file.Add(0);
    }

    private void Patch(int at, long value, int size)
    {
        byte[] bytes = Number(value, size);
        for (int b = 0; b < size; b++)
            file[at + b] = bytes[b];
    }

    private byte[] Number(long value, int size)
    {
        IEnumerable<byte> bytes = Enumerable.Range(0, size).Select(b => (byte)(value >> (8 * b)));
        return bigEndian ? [.. bytes.Reverse()] : [.. bytes];
    }
}
