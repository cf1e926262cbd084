using System.Buffers.Binary;
using System.Text;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>A field to be written: its values are bytes in the file's byte order.</summary>
internal readonly record struct OutputField(ushort Tag, FieldType Type, long Count, byte[] Value);

/// <summary>Makes fields and writes directories in the byte order and container of one file.</summary>
internal sealed class DirectoryWriter(OutputFileStream output, bool bigEndian, bool isBig)
{
    private static ReadOnlySpan<byte> Zeros => [0, 0, 0, 0, 0, 0, 0, 0];

    private readonly int offsetSize = isBig ? 8 : 4;

    /// <summary>Writes the file's header; the place of the first directory is patched by <see cref="PatchFirst"/>.</summary>
    public void WriteHeader()
    {
        output.Append(bigEndian ? "MM"u8 : "II"u8);
        output.Append(Bytes(isBig ? 43 : 42, 2));
        if (isBig)
        {
            output.Append(Bytes(8, 2));
            output.Append(Bytes(0, 2));
        }

        output.Append(Bytes(0, offsetSize));
    }

    /// <summary>Sets the place of the first directory. Everything before must have been flushed.</summary>
    public void PatchFirst(long offset) => output.WriteAt(isBig ? 8 : 4, Bytes(offset, offsetSize));

    /// <summary>A field of one 16-bit number, said as often as there are samples in a pixel.</summary>
    public OutputField Short(ushort tag, int value, int times = 1) =>
        new(tag, FieldType.Short, times, [.. Enumerable.Repeat(Bytes(value, 2), times).SelectMany(b => b)]);

    /// <summary>A field of 32-bit numbers.</summary>
    public OutputField Long(ushort tag, params ReadOnlySpan<long> values) => Numbers(tag, FieldType.Long, values);

    /// <summary>A field of offsets: 32 bits in classic TIFF, 64 in BigTIFF.</summary>
    public OutputField Offsets(ushort tag, ReadOnlySpan<long> values) => Numbers(tag, isBig ? FieldType.Long8 : FieldType.Long, values);

    /// <summary>A field of text, in UTF-8 with a closing zero.</summary>
    public static OutputField Text(ushort tag, string text)
    {
        byte[] bytes = Encoding.UTF8.GetBytes(text + "\0");
        return new OutputField(tag, FieldType.Ascii, bytes.Length, bytes);
    }

    /// <summary>
    /// Writes a directory, at a multiple of 8, and then the values that do not fit into it. The next directory is to follow
    /// directly.
    /// </summary>
    /// <param name="fields">The fields, ascending by tag, each tag once.</param>
    /// <param name="last">True for the last directory of the chain.</param>
    public void Write(IReadOnlyList<OutputField> fields, bool last)
    {
        long valueAt = output.Position + (isBig ? 16 : 6) + (fields.Count * (isBig ? 20L : 12L));
        valueAt += -valueAt & 7;
        output.Append(Bytes(fields.Count, isBig ? 8 : 2));
        foreach (OutputField field in fields)
        {
            output.Append(Bytes(field.Tag, 2));
            output.Append(Bytes((ushort)field.Type, 2));
            output.Append(Bytes(field.Count, offsetSize));
            if (field.Value.Length <= offsetSize)
            {
                output.Append(field.Value);
                output.Append(Zeros[..(offsetSize - field.Value.Length)]);
            }
            else
            {
                output.Append(Bytes(valueAt, offsetSize));
                valueAt += field.Value.Length;
                valueAt += -valueAt & 7;
            }
        }

        output.Append(Bytes(last ? 0 : valueAt, offsetSize));
        output.Align();
        foreach (OutputField field in fields)
        {
            if (field.Value.Length <= offsetSize)
                continue;
            output.Append(field.Value);
            output.Align();
        }
    }

    private OutputField Numbers(ushort tag, FieldType type, ReadOnlySpan<long> values)
    {
        int size = type.Size();
        byte[] bytes = new byte[values.Length * size];
        for (int i = 0; i < values.Length; i++)
            Put(bytes.AsSpan(i * size, size), values[i]);
        return new OutputField(tag, type, values.Length, bytes);
    }

    private byte[] Bytes(long value, int size)
    {
        byte[] bytes = new byte[size];
        Put(bytes, value);
        return bytes;
    }

    private void Put(Span<byte> bytes, long value)
    {
        if (bytes.Length == 4 && value > uint.MaxValue)
            throw new StackIOException(output.Path, $"classic TIFF cannot point to byte {value}", "split the stack; a stack that may pass 4 GiB is written as BigTIFF, so please report this");
        Span<byte> all = stackalloc byte[8];
        if (bigEndian)
            BinaryPrimitives.WriteInt64BigEndian(all, value);
        else
            BinaryPrimitives.WriteInt64LittleEndian(all, value);
        (bigEndian ? all[^bytes.Length..] : all[..bytes.Length]).CopyTo(bytes);
    }
}
