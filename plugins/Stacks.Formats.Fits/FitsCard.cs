using System.Globalization;
using System.Text;

namespace Stacks.Formats.Fits;

/// <summary>
/// One header card (keyword record), verbatim: 80 characters, each a byte of the file (Latin-1), so that a card that is
/// carried is carried to the bit. FITS Standard 4.0, section 4.
/// </summary>
/// <param name="Image">The 80 characters.</param>
internal readonly record struct FitsCard(string Image)
{
    private const string HierarchPrefix = "HIERARCH ";
    private const int LongestPart = 67;

    /// <summary>A card of spaces: legal anywhere before END.</summary>
    public static FitsCard Blank { get; } = new(new string(' ', FitsBlock.CardBytes));

    /// <summary>The card that ends a header.</summary>
    public static FitsCard End { get; } = Padded("END");

    /// <summary>
    /// The keyword without padding: columns 1-8, or <c>HIERARCH</c> and the words up to the equals sign. Empty for
    /// cards of spaces.
    /// </summary>
    public string Keyword => HierarchEquals() is > 0 and int equals ? Image[..equals].TrimEnd() : Image[..8].TrimEnd();

    /// <summary>True when the card gives its keyword a value (which may be undefined).</summary>
    public bool HasValue => HierarchEquals() > 0
        || (Image[8] == '=' && Image[9] == ' ' && !Is("COMMENT") && !Is("HISTORY") && !Is("CONTINUE") && !Is(""));

    /// <summary>
    /// The value as text: the content of a string with its quotes undone and trailing spaces removed, or the characters
    /// of a number or logical. Empty when undefined or when the card has no value. CONTINUE has its string.
    /// </summary>
    public string Value => Split().Value;

    /// <summary>True when the value is a string in quotes.</summary>
    public bool IsText => Split().IsText;

    /// <summary>The comment behind the slash, trimmed.</summary>
    public string Comment => Split().Comment;

    /// <summary>True when columns 1-8 hold this keyword.</summary>
    public bool Is(string keyword) =>
        Image.AsSpan(0, keyword.Length).SequenceEqual(keyword) && Image.AsSpan(keyword.Length, 8 - keyword.Length).Trim(' ').IsEmpty;

    /// <summary>A logical value in fixed format.</summary>
    public static FitsCard Logical(string keyword, bool value, string comment) => Fixed(keyword, value ? "T" : "F", comment);

    /// <summary>An integer in fixed format.</summary>
    public static FitsCard Integer(string keyword, Int128 value, string comment) =>
        Fixed(keyword, value.ToString(CultureInfo.InvariantCulture), comment);

    /// <summary>A real number with all its digits; undefined when it is not finite, for FITS has no word for that.</summary>
    public static FitsCard Number(string keyword, double value, string comment)
    {
        string text = double.IsFinite(value) ? value.ToString("R", CultureInfo.InvariantCulture) : "";
        if (text.Length > 0 && !text.Contains('.', StringComparison.Ordinal))
        {
            int exponent = text.IndexOf('E', StringComparison.Ordinal);
            text = exponent < 0 ? text + ".0" : text.Insert(exponent, ".0");
        }

        return Fixed(keyword, text, comment);
    }

    /// <summary>A string; one that is too long for a card goes on in CONTINUE cards (section 4.2.1.2).</summary>
    public static IEnumerable<FitsCard> Text(string keyword, string value, string comment)
    {
        string rest = Ascii(value).Replace("'", "''", StringComparison.Ordinal);
        string start = keyword.PadRight(8) + "= ";
        while (rest.Length > LongestPart + 1)
        {
            // A doubled quote must not be cut in two.
            int cut = LongestPart - (rest[..LongestPart].Reverse().TakeWhile(c => c == '\'').Count() % 2);
            yield return Padded($"{start}'{rest[..cut]}&'");
            rest = rest[cut..];
            start = "CONTINUE  ";
        }

        string last = $"{start}'{rest.PadRight(8)}'";
        yield return Padded(comment.Length == 0 ? last : $"{last.PadRight(30)} / {Ascii(comment)}");
    }

    /// <summary>COMMENT or HISTORY: as many cards as the text needs, broken at spaces where there are any.</summary>
    public static IEnumerable<FitsCard> Commentary(string keyword, string text)
    {
        const int room = FitsBlock.CardBytes - 8;
        string rest = Ascii(text);
        string indent = "";
        do
        {
            int space = room - indent.Length;
            int cut = rest.Length <= space ? rest.Length : rest.LastIndexOf(' ', space) is > 0 and int at ? at : space;
            yield return Padded(keyword.PadRight(8) + indent + rest[..cut]);
            rest = rest[cut..].TrimStart();
            indent = "  ";
        }
        while (rest.Length > 0);
    }

    /// <summary>This card with another comment, where one is given and fits.</summary>
    public FitsCard WithComment(string comment)
    {
        if (comment.Length == 0)
            return this;
        int slash = Image.LastIndexOf(" / " + Comment, StringComparison.Ordinal);
        string value = Comment.Length > 0 && slash > 0 ? Image[..slash] : Image.TrimEnd();
        return Padded($"{value.PadRight(30)} / {comment}");
    }

    private static FitsCard Fixed(string keyword, string value, string comment) =>
        Padded($"{keyword,-8}= {value,20}" + (comment.Length == 0 ? "" : " / " + Ascii(comment)));

    private static FitsCard Padded(string text) =>
        new(text.Length > FitsBlock.CardBytes ? text[..FitsBlock.CardBytes] : text.PadRight(FitsBlock.CardBytes));

    /// <summary>Header text is ASCII 32-126; other characters are written as \uXXXX.</summary>
    private static string Ascii(string text)
    {
        StringBuilder ascii = new(text.Length);
        foreach (char c in text)
        {
            if (c is >= ' ' and <= '~')
                ascii.Append(c);
            else
                ascii.Append(CultureInfo.InvariantCulture, $"\\u{(int)c:x4}");
        }

        return ascii.ToString();
    }

    /// <summary>Place of the equals sign of a HIERARCH card (common practice, registered convention); 0 when it is none.</summary>
    private int HierarchEquals() =>
        Image.StartsWith(HierarchPrefix, StringComparison.Ordinal) ? Math.Max(Image.IndexOf('=', StringComparison.Ordinal), 0) : 0;

    private (string Value, bool IsText, string Comment) Split()
    {
        if (!HasValue && !Is("CONTINUE"))
            return ("", false, "");
        string field = Image[(HierarchEquals() is > 0 and int equals ? equals + 1 : 10)..].TrimStart();
        if (!field.StartsWith('\''))
        {
            int slash = field.IndexOf('/', StringComparison.Ordinal);
            return slash < 0 ? (field.TrimEnd(), false, "") : (field[..slash].TrimEnd(), false, field[(slash + 1)..].Trim());
        }

        StringBuilder text = new();
        int i = 1;
        for (; i < field.Length; i++)
        {
            if (field[i] == '\'' && (i + 1 >= field.Length || field[i + 1] != '\''))
                break;
            text.Append(field[i]);
            if (field[i] == '\'')
                i++;
        }

        string tail = i + 1 < field.Length ? field[(i + 1)..] : "";
        int commentAt = tail.IndexOf('/', StringComparison.Ordinal);
        return (text.ToString().TrimEnd(' '), true, commentAt < 0 ? "" : tail[(commentAt + 1)..].Trim());
    }
}
