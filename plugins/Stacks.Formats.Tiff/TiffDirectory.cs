using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>One field of a directory. Its values stay in the file.</summary>
/// <param name="Tag">Tag number.</param>
/// <param name="Type">Type of the values; may be unknown.</param>
/// <param name="Count">Values.</param>
/// <param name="ValueAt">Offset of the first value's bytes, in the directory itself where they fit.</param>
internal readonly record struct TiffField(ushort Tag, FieldType Type, long Count, long ValueAt)
{
    /// <summary>Bytes of all values; the count has been checked against the file's length.</summary>
    public long ByteLength => Count * Type.Size();
}

/// <summary>A part of the file that a page needs lies beyond the end of the file.</summary>
/// <param name="offset">Where that part should be.</param>
/// <param name="what">What it is, with its length.</param>
/// <param name="next">Offset of the next directory, 0 after the last; null where that is cut off too.</param>
internal sealed class CutOffException(long offset, string what, long? next) : Exception(what)
{
    /// <summary>Offset of the next directory, 0 after the last; null where that is cut off too.</summary>
    public long? Next { get; } = next;

    /// <summary>Where the missing part should be.</summary>
    public long Offset { get; } = offset;
}

/// <summary>One image file directory: its fields in ascending order of tags, and where the next directory is.</summary>
internal sealed class TiffDirectory
{
    private readonly TiffFile file;
    private List<TiffField> fields = [];
    private bool ascending = true;

    private TiffDirectory(TiffFile file, string where)
    {
        this.file = file;
        Where = where;
    }

    /// <summary>File and page, for errors.</summary>
    public string Where { get; }

    /// <summary>The fields whose type is known, each tag once.</summary>
    public IReadOnlyList<TiffField> Fields => fields;

    /// <summary>Tags of a type this plugin does not know the size of: they cannot be carried.</summary>
    public List<ushort> Unknown { get; } = [];

    /// <summary>Fields of a truncated file that say nothing about the samples and are cut off, a sentence each.</summary>
    public List<string> Lost { get; } = [];

    /// <summary>Offset of the next directory; 0 after the last.</summary>
    public long Next { get; private set; }

    /// <summary>Bytes of the directory itself.</summary>
    public long ByteLength { get; private set; }

    /// <summary>Reads the directory at an offset.</summary>
    /// <exception cref="CutOffException">A part of it lies beyond the end of the file.</exception>
    public static TiffDirectory Read(TiffFile file, FileWindow window, long offset, string where)
    {
        TiffDirectory directory = new(file, where);
        directory.Load(window, offset);
        return directory;
    }

    /// <summary>The field with a tag, or null.</summary>
    public TiffField? Find(ushort tag)
    {
        foreach (TiffField field in fields)
        {
            if (field.Tag == tag)
                return field;
        }

        return null;
    }

    /// <summary>The first value of a whole-number field, or a default where the field is absent or empty.</summary>
    /// <exception cref="StackFormatException">The field holds something else.</exception>
    public long Number(FileWindow window, ushort tag, long missing)
    {
        if (Find(tag) is not { Count: > 0 } field)
            return missing;
        if (!field.Type.IsWholeNumber())
            throw new StackFormatException($"{Where}, tag {tag}", $"a whole number is expected, the field's type is {field.Type}", "copy the file again from its source");
        return Value(window, field, 0);
    }

    /// <summary>One value of a whole-number field.</summary>
    public long Value(FileWindow window, TiffField field, int index) =>
        file.Number(window.At(field.ValueAt + ((long)index * field.Type.Size()), field.Type.Size()));

    private void Load(FileWindow window, long offset)
    {
        int head = file.IsBig ? 8 : 2;
        int entrySize = file.IsBig ? 20 : 12;
        if (!file.Holds(offset, head))
            throw new CutOffException(offset, "its directory", null);
        long count = file.Number(window.At(offset, head));
        if (count > (file.Length - offset - head - file.OffsetSize) / entrySize)
            throw new CutOffException(offset, string.Create(CultureInfo.InvariantCulture, $"its directory of {count} fields"), null);
        ByteLength = head + (count * entrySize) + file.OffsetSize;
        if (count > ushort.MaxValue)
            throw new StackFormatException($"{Where}, byte {offset}", $"the directory has {count} fields", "copy the file again from its source");

        ReadOnlySpan<byte> bytes = window.At(offset, (int)ByteLength);
        Next = file.Number(bytes[^file.OffsetSize..]);
        for (int i = 0; i < count; i++)
        {
            int at = head + (i * entrySize);
            Add(bytes.Slice(at, entrySize), offset + at);
        }

        if (!ascending)
            fields = [.. fields.DistinctBy(f => f.Tag).OrderBy(f => f.Tag)];
    }

    private void Add(ReadOnlySpan<byte> entry, long entryAt)
    {
        ushort tag = (ushort)file.Number(entry[..2]);
        FieldType type = (FieldType)file.Number(entry.Slice(2, 2));
        long count = file.Number(entry.Slice(4, file.OffsetSize));
        if (type.Size() == 0)
        {
            Unknown.Add(tag);
            return;
        }

        int inlineAt = 4 + file.OffsetSize;
        bool isInline = count <= file.OffsetSize / type.Size();
        long valueAt = isInline ? entryAt + inlineAt : file.Number(entry[inlineAt..]);
        if (count > file.Length / type.Size() || !file.Holds(valueAt, count * type.Size()))
        {
            if (!file.AllowTruncated || CarriedFields.IsStructure(tag))
                throw new CutOffException(valueAt, string.Create(CultureInfo.InvariantCulture, $"tag {tag} with {count} values"), Next);
            Lost.Add(string.Create(CultureInfo.InvariantCulture, $"tag {tag} is lost: its {count} values should be at byte {valueAt}, the file ends at byte {file.Length}"));
            return;
        }

        ascending &= fields.Count == 0 || fields[^1].Tag < tag;
        fields.Add(new TiffField(tag, type, count, valueAt));
    }
}
