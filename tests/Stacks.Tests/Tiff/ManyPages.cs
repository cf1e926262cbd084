namespace Stacks.Tests.Tiff;

/// <summary>Stacks of very many pages of 1 x 1 sample that hold their own number.</summary>
internal static class ManyPages
{
    /// <summary>A little-endian file, every directory before its page's data.</summary>
    public static byte[] Build(int count, bool big)
    {
        MemoryStream file = new();
        BinaryWriter writer = new(file);
        void Offset(long value)
        {
            if (big)
                writer.Write(value);
            else
                writer.Write((uint)value);
        }

        writer.Write((ushort)0x4949);
        writer.Write((ushort)(big ? 43 : 42));
        if (big)
            writer.Write(8);
        Offset(big ? 16 : 8);
        int bytes = big ? 8 + (7 * 20) + 8 : 2 + (7 * 12) + 4;
        for (int i = 0; i < count; i++)
        {
            long end = file.Position + bytes;
            (int Tag, long Value)[] fields = [(256, 1), (257, 1), (258, 16), (262, 1), (273, end), (278, 1), (279, 2)];
            if (big)
                writer.Write((long)fields.Length);
            else
                writer.Write((short)fields.Length);
            foreach ((int tag, long value) in fields)
            {
                writer.Write((ushort)tag);
                writer.Write((ushort)(big ? 16 : 4));
                Offset(1);
                Offset(value);
            }

            Offset(i == count - 1 ? 0 : end + 2);
            writer.Write((ushort)i);
        }

        return file.ToArray();
    }
}
