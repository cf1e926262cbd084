using System.Buffers.Binary;

namespace Stacks.Tests.Samples;

/// <summary>
/// A small TIFF reader that shares nothing with the plugin under test: uncompressed 16-bit strips of classic
/// little-endian files (TIFF 6.0, sections 2 and 3), pages in the order of the directory chain.
/// </summary>
internal static class PlainTiff
{
    public static List<PlainPlane> Read(string path)
    {
        byte[] file = File.ReadAllBytes(path);
        if (file is not [(byte)'I', (byte)'I', 42, 0, ..])
            throw new NotSupportedException("not a classic little-endian TIFF");
        List<PlainPlane> pages = [];
        for (uint at = Long(file, 4); at != 0;)
        {
            int count = Short(file, at);
            Dictionary<int, uint[]> fields = [];
            for (int i = 0; i < count; i++)
            {
                long entry = at + 2 + (12 * i);
                fields[Short(file, entry)] = Numbers(file, entry);
            }

            pages.Add(Page(file, fields));
            at = Long(file, at + 2 + (12 * count));
        }

        return pages;
    }

    private static PlainPlane Page(byte[] file, Dictionary<int, uint[]> fields)
    {
        const int Width = 256, Height = 257, BitsPerSample = 258, Compression = 259, Offsets = 273, Counts = 279;
        if (fields[BitsPerSample][0] != 16 || fields[Compression][0] != 1)
            throw new NotSupportedException("not 16 bit without compression");
        int width = (int)fields[Width][0], height = (int)fields[Height][0], filled = 0;
        double[] values = new double[width * height];
        foreach ((uint offset, uint bytes) in fields[Offsets].Zip(fields[Counts]))
        {
            for (uint i = 0; i < bytes; i += 2)
                values[filled++] = Short(file, offset + i);
        }

        return new PlainPlane("", 16, width, height, values);
    }

    // The values of a field of type SHORT or LONG; nothing for other types.
    private static uint[] Numbers(byte[] file, long entry)
    {
        int type = Short(file, entry + 2), size = type == 3 ? 2 : 4;
        uint count = Long(file, entry + 4);
        if (type is not (3 or 4))
            return [];
        long place = count * size <= 4 ? entry + 8 : Long(file, entry + 8);
        return [.. Enumerable.Range(0, (int)count).Select(i =>
            type == 3 ? Short(file, place + (2 * i)) : Long(file, place + (4 * i)))];
    }

    private static ushort Short(byte[] file, long at) => BinaryPrimitives.ReadUInt16LittleEndian(file.AsSpan((int)at));

    private static uint Long(byte[] file, long at) => BinaryPrimitives.ReadUInt32LittleEndian(file.AsSpan((int)at));
}
