using System.Buffers.Binary;
using System.Text;

namespace Stacks.SampleStacks;

/// <summary>
/// Writes 16-bit planes as a little-endian classic TIFF (TIFF 6.0), a page each, one strip a page, uncompressed, with
/// the OME-XML as the first page's description in UTF-8.
/// </summary>
internal static class OmeTiffFile
{
    private const ushort Ascii = 2, Short = 3, Long = 4, Rational = 5;

    /// <summary>Writes the file.</summary>
    /// <param name="path">File to write.</param>
    /// <param name="xml">OME-XML.</param>
    /// <param name="planes">Samples of each page, whole numbers from 0 to 65535.</param>
    /// <param name="width">Columns.</param>
    /// <param name="height">Rows.</param>
    /// <param name="pixelsPerCentimetre">Resolution of the specimen plane.</param>
    public static void Write(string path, string xml, IReadOnlyList<double[]> planes, int width, int height, uint pixelsPerCentimetre)
    {
        using FileStream file = File.Create(path);
        file.Write([(byte)'I', (byte)'I', 42, 0, 0, 0, 0, 0]);
        long link = 4;
        for (int page = 0; page < planes.Count; page++)
        {
            uint strip = Append(file, Samples(planes[page]));
            uint resolution = Append(file, [.. Number(pixelsPerCentimetre), .. Number(1)]);
            List<(ushort Tag, ushort Type, uint Count, uint Value)> entries =
            [
                (256, Long, 1, (uint)width),
                (257, Long, 1, (uint)height),
                (258, Short, 1, 16),
                (259, Short, 1, 1),
                (262, Short, 1, 1),
                (273, Long, 1, strip),
                (277, Short, 1, 1),
                (278, Long, 1, (uint)height),
                (279, Long, 1, (uint)(2 * width * height)),
                (282, Rational, 1, resolution),
                (283, Rational, 1, resolution),
                (296, Short, 1, 3),
                (339, Short, 1, 1),
            ];
            if (page == 0)
            {
                byte[] description = [.. Encoding.UTF8.GetBytes(xml), 0];
                entries.Insert(5, (270, Ascii, (uint)description.Length, Append(file, description)));
            }

            link = Directory(file, link, entries);
        }
    }

    // Appends a directory, points the previous link at it, and returns the place of its own link.
    private static long Directory(FileStream file, long link, List<(ushort Tag, ushort Type, uint Count, uint Value)> entries)
    {
        byte[] bytes = new byte[2 + (12 * entries.Count) + 4];
        BinaryPrimitives.WriteUInt16LittleEndian(bytes, (ushort)entries.Count);
        for (int i = 0; i < entries.Count; i++)
        {
            Span<byte> entry = bytes.AsSpan(2 + (12 * i), 12);
            BinaryPrimitives.WriteUInt16LittleEndian(entry, entries[i].Tag);
            BinaryPrimitives.WriteUInt16LittleEndian(entry[2..], entries[i].Type);
            BinaryPrimitives.WriteUInt32LittleEndian(entry[4..], entries[i].Count);
            BinaryPrimitives.WriteUInt32LittleEndian(entry[8..], entries[i].Value);
        }

        uint start = Append(file, bytes);
        file.Position = link;
        file.Write(Number(start));
        file.Position = file.Length;
        return start + bytes.Length - 4;
    }

    // Appends at the next even offset, as TIFF asks, and returns the offset.
    private static uint Append(FileStream file, byte[] bytes)
    {
        if (file.Position % 2 != 0)
            file.WriteByte(0);
        uint start = (uint)file.Position;
        file.Write(bytes);
        return start;
    }

    private static byte[] Samples(double[] plane)
    {
        byte[] bytes = new byte[2 * plane.Length];
        for (int i = 0; i < plane.Length; i++)
            BinaryPrimitives.WriteUInt16LittleEndian(bytes.AsSpan(2 * i), (ushort)plane[i]);
        return bytes;
    }

    private static byte[] Number(uint value)
    {
        byte[] bytes = new byte[4];
        BinaryPrimitives.WriteUInt32LittleEndian(bytes, value);
        return bytes;
    }
}
