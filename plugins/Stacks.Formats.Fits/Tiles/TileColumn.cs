using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>A column of a binary table (Standard 4.0, section 7.3).</summary>
/// <param name="Name">TTYPEn.</param>
/// <param name="Offset">Bytes of a row before it.</param>
/// <param name="Repeat">Elements in a row; descriptors of arrays in the heap are one or none.</param>
/// <param name="Type">Letter of the type; P and Q are descriptors of 32 and 64 bits.</param>
/// <param name="HeapType">Letter of the elements in the heap; P and Q only.</param>
internal sealed record TileColumn(string Name, int Offset, long Repeat, char Type, char HeapType)
{
    /// <summary>The standard's columns are six; a program may add some of its own.</summary>
    private const int MostFields = 99;

    /// <summary>True for a column of arrays in the heap.</summary>
    public bool IsInHeap => Type is 'P' or 'Q' && Repeat == 1;

    /// <summary>True for a column of one number a row.</summary>
    public bool IsNumber => Type is 'B' or 'I' or 'J' or 'K' or 'E' or 'D' && Repeat == 1;

    /// <summary>The columns of a table whose rows are <paramref name="rowBytes"/> long.</summary>
    /// <exception cref="StackFormatException">A column is not described, or the columns do not fill a row.</exception>
    public static IReadOnlyList<TileColumn> Read(FitsHeader header, long rowBytes)
    {
        int fields = (int)header.RequiredInteger("TFIELDS", 0, MostFields);
        List<TileColumn> columns = [];
        long offset = 0;
        for (int i = 1; i <= fields; i++)
        {
            string keyword = string.Create(CultureInfo.InvariantCulture, $"TFORM{i}");
            string form = header.OwnText(keyword)?.Trim() ?? "";
            int digits = form.TakeWhile(char.IsAsciiDigit).Count();
            long repeat = 1;
            if (digits == form.Length || (digits > 0 && !long.TryParse(form.AsSpan(0, digits), NumberStyles.None, CultureInfo.InvariantCulture, out repeat)) || repeat > rowBytes * 8)
                throw new StackFormatException($"{header.Where}, keyword {keyword}", $"'{form}' is no column of a row of {rowBytes} bytes", "get the file again");
            char type = char.ToUpperInvariant(form[digits]);
            char heapType = type is 'P' or 'Q' && form.Length > digits + 1 ? char.ToUpperInvariant(form[digits + 1]) : ' ';
            string name = header.OwnText(string.Create(CultureInfo.InvariantCulture, $"TTYPE{i}"))?.Trim().ToUpperInvariant() ?? "";
            columns.Add(new TileColumn(name, (int)offset, repeat, type, heapType));
            offset += type == 'X' ? (repeat + 7) / 8 : repeat * BytesOf(type, header, keyword);
            if (offset > rowBytes)
                throw new StackFormatException($"{header.Where}, keyword {keyword}", $"the columns are longer than a row of {rowBytes} bytes (NAXIS1)", "get the file again");
        }

        return columns;
    }

    /// <summary>Bytes of an element of a type; 0 for a letter that is none of a number's.</summary>
    public static int NumberBytes(char type) => type switch
    {
        'B' => 1,
        'I' => 2,
        'J' or 'E' => 4,
        'K' or 'D' => 8,
        _ => 0,
    };

    private static int BytesOf(char type, FitsHeader header, string keyword) => type switch
    {
        'L' or 'A' => 1,
        'C' or 'P' => 8,
        'M' or 'Q' => 16,
        _ when NumberBytes(type) is > 0 and int bytes => bytes,
        _ => throw new StackFormatException($"{header.Where}, keyword {keyword}", $"the standard has no type of column '{type}'", "get the file again"),
    };
}
