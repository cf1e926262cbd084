using System.Buffers;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// The period of a colour-filter mosaic from keywords that spell its filters row by row, such as <c>'RGGB'</c>
/// (common practice: four letters are 2 x 2; FITS itself says nothing about mosaics).
/// </summary>
internal static class MosaicPattern
{
    private static readonly string[] Keywords = ["BAYERPAT", "CFAPAT", "CFA_PAT", "COLORTYP"];
    private static readonly char[] RowSeparators = ['/', ',', ';', '|'];

    /// <summary>Red, green, blue, cyan, magenta, yellow, white, luminance.</summary>
    private static readonly SearchValues<char> Filters = SearchValues.Create("RGBCMYWL");

    /// <summary>The first mosaic keyword's text; null when no keyword names more than one filter.</summary>
    public static string? Text(FitsHeader header) =>
        Keywords.Select(header.Find).FirstOrDefault(text => text is not null && IsPattern(text));

    /// <summary>The mosaic's period; 1 x 1 where there is no mosaic, or its pattern cannot be laid out.</summary>
    public static Lattice Read(FitsHeader header) => Text(header) is { } text ? Period(text) : Lattice.Single;

    /// <summary>
    /// The smallest period of a pattern. Rows are parted by a separator, or the pattern is square (4, 9, 16, 25, 36
    /// letters); of any other length its rows are not known.
    /// </summary>
    public static Lattice Period(string pattern)
    {
        string[] rows = pattern.Trim().ToUpperInvariant().Split(RowSeparators, StringSplitOptions.TrimEntries | StringSplitOptions.RemoveEmptyEntries);
        if (rows.Length == 1)
        {
            int side = (int)Math.Sqrt(rows[0].Length);
            if (side < 2 || side * side != rows[0].Length)
                return Lattice.Single;
            rows = rows[0].Chunk(side).Select(row => new string(row)).ToArray();
        }

        if (rows.Length == 0 || rows.Any(row => row.Length != rows[0].Length))
            return Lattice.Single;
        int width = rows[0].Length, height = rows.Length;
        int periodX = Enumerable.Range(1, width).First(p => width % p == 0 && rows.All(row => Enumerable.Range(p, width - p).All(x => row[x] == row[x - p])));
        int periodY = Enumerable.Range(1, height).First(p => height % p == 0 && Enumerable.Range(p, height - p).All(y => rows[y] == rows[y - p]));
        return new Lattice(periodX, periodY);
    }

    private static bool IsPattern(string text)
    {
        string letters = string.Concat(text.Trim().ToUpperInvariant().Split(RowSeparators, StringSplitOptions.TrimEntries));
        return letters.Length >= 4 && !letters.AsSpan().ContainsAnyExcept(Filters) && letters.Distinct().Count() > 1;
    }
}
