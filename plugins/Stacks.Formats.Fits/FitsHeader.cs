using System.Globalization;
using System.Text;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// A header: its cards in order, verbatim, without END. Where a keyword stands twice the first counts (common practice).
/// </summary>
internal sealed class FitsHeader
{
    /// <summary>28.8 MB; the longest headers in use are far below. Bounds what a file without END can make us read.</summary>
    private const int MostBlocks = 10_000;

    /// <summary>2^53: doubles below it hold every integer.</summary>
    private const double LargestExactInteger = 1L << 53;

    /// <summary>A header of given cards.</summary>
    public FitsHeader(string where, IReadOnlyList<FitsCard> cards, long bytes)
    {
        Where = where;
        Cards = cards;
        Bytes = bytes;
    }

    /// <summary>File and HDU, for errors.</summary>
    public string Where { get; }

    /// <summary>The cards, without END.</summary>
    public IReadOnlyList<FitsCard> Cards { get; }

    /// <summary>Bytes in the file, whole blocks.</summary>
    public long Bytes { get; }

    /// <summary>The primary header, when this one says INHERIT = T; else null.</summary>
    public FitsHeader? Inherited { get; set; }

    /// <summary>Reads the header at an offset; null when the file ends before its END card.</summary>
    /// <exception cref="StackFormatException">There is no END card.</exception>
    public static FitsHeader? Read(FitsFile file, long offset, string where)
    {
        List<FitsCard> cards = [];
        byte[] block = new byte[FitsBlock.Bytes];
        for (int count = 1; count <= MostBlocks; count++, offset += block.Length)
        {
            if (file.Present(offset, block.Length) < block.Length)
                return null;
            file.Read(block, offset);
            for (int at = 0; at < block.Length; at += FitsBlock.CardBytes)
            {
                FitsCard card = new(Encoding.Latin1.GetString(block, at, FitsBlock.CardBytes));
                if (card.Is("END"))
                    return new FitsHeader(where, cards, (long)count * FitsBlock.Bytes);
                if (card.Image.AsSpan(0, 8).ContainsAnyExceptInRange(' ', '~'))
                    throw new StackFormatException($"{where}, byte {offset + at}", "the header runs into binary data before its END card", "the file is damaged or not FITS; get it again");
                cards.Add(card);
            }
        }

        throw new StackFormatException(where, $"no END card within {MostBlocks} blocks", "the file is damaged or not FITS; get it again");
    }

    /// <summary>The first card of this header with a keyword; null when there is none.</summary>
    public FitsCard? Own(string keyword)
    {
        bool isLong = keyword.Length > 8;
        foreach (FitsCard card in Cards)
        {
            if ((isLong ? card.Keyword == keyword : card.Is(keyword)) && card.HasValue)
                return card;
        }

        return null;
    }

    /// <summary>The value text of a keyword here or in the inherited header; null when absent or undefined.</summary>
    public string? Find(string keyword)
    {
        string? own = OwnText(keyword);
        return own ?? Inherited?.Find(keyword);
    }

    /// <summary>A finite number by keyword, here or inherited; null when absent, undefined or no number.</summary>
    public double? FindNumber(string keyword) => Find(keyword) is { } text ? ParseNumber(text) : null;

    /// <summary>The numbers of this header's hierarchical keywords with a last word, such as <c>" RON"</c>.</summary>
    public IEnumerable<double> NumbersEndingWith(string lastWord)
    {
        foreach (FitsCard card in Cards)
        {
            if (card.Is("HIERARCH") && card.Keyword.EndsWith(lastWord, StringComparison.Ordinal) && ParseNumber(card.Value) is { } value)
                yield return value;
        }
    }

    /// <summary>The value text of a keyword in this header, CONTINUE cards joined; null when absent or undefined.</summary>
    public string? OwnText(string keyword)
    {
        for (int i = 0; i < Cards.Count; i++)
        {
            if (!(keyword.Length > 8 ? Cards[i].Keyword == keyword : Cards[i].Is(keyword)) || !Cards[i].HasValue)
                continue;
            string text = Cards[i].Value;
            while (text.EndsWith('&') && i + 1 < Cards.Count && Cards[i + 1].Is("CONTINUE"))
                text = text[..^1] + Cards[++i].Value;
            return text.Length == 0 ? null : text;
        }

        return null;
    }

    /// <summary>An integer of this header, also one that is written as a real number; null when absent.</summary>
    /// <exception cref="StackFormatException">The value is no integer of 64 bits.</exception>
    public long? OwnInteger(string keyword)
    {
        if (Own(keyword) is not { } card)
            return null;
        if (long.TryParse(card.Value, NumberStyles.AllowLeadingSign, CultureInfo.InvariantCulture, out long value))
            return value;
        return ParseNumber(card.Value) is { } number && Math.Abs(number) < LargestExactInteger && number == Math.Truncate(number)
            ? (long)number
            : throw new StackFormatException($"{Where}, keyword {keyword}", $"'{card.Value}' is not an integer", "repair the header or get the file again");
    }

    /// <summary>A mandatory integer of this header within bounds.</summary>
    /// <exception cref="StackFormatException">Absent, no integer, or out of bounds.</exception>
    public long RequiredInteger(string keyword, long least, long most)
    {
        long value = OwnInteger(keyword)
            ?? throw new StackFormatException($"{Where}, keyword {keyword}", "the mandatory keyword is missing", "repair the header or get the file again");
        return value >= least && value <= most
            ? value
            : throw new StackFormatException($"{Where}, keyword {keyword}", $"{value} is outside {least} to {most}", "repair the header or get the file again");
    }

    /// <summary>A finite number of this header; null when absent or undefined.</summary>
    /// <exception cref="StackFormatException">The value is no finite number.</exception>
    public double? OwnNumber(string keyword)
    {
        if (OwnText(keyword) is not { } text)
            return null;
        return ParseNumber(text)
            ?? throw new StackFormatException($"{Where}, keyword {keyword}", $"'{text}' is not a finite number", "repair the header or get the file again");
    }

    /// <summary>True when this header gives a logical keyword the value T.</summary>
    public bool OwnTrue(string keyword) => Own(keyword) is { IsText: false, Value: "T" };

    /// <summary>A number as FITS writes it: exponents by E or D.</summary>
    private static double? ParseNumber(string text) =>
        double.TryParse(text.Replace('D', 'E').Replace('d', 'E'), NumberStyles.Float, CultureInfo.InvariantCulture, out double value) && double.IsFinite(value)
            ? value
            : null;
}
