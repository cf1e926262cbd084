using System.Text;
using System.Xml;

namespace Stacks.Formats.Tiff;

/// <summary>A piece of a text.</summary>
internal readonly record struct TextSpan(int Start, int Length);

/// <summary>
/// An XML text and the places in it that a reader's line and column name, so that single values can be replaced and
/// everything else stays as it is.
/// </summary>
internal sealed class XmlText
{
    private readonly List<int> lineStarts = [0];

    /// <summary>Notes where the lines of a text start: after CR LF, CR or LF.</summary>
    public XmlText(string text)
    {
        Text = text;
        for (int i = 0; i < text.Length; i++)
        {
            if (text[i] == '\n' || (text[i] == '\r' && (i + 1 == text.Length || text[i + 1] != '\n')))
                lineStarts.Add(i + 1);
        }
    }

    /// <summary>The text.</summary>
    public string Text { get; }

    /// <summary>Settings for every reader of XML here: no DTD (entity bombs), nothing from outside.</summary>
    public static XmlReaderSettings Settings => new() { DtdProcessing = DtdProcessing.Prohibit, XmlResolver = null };

    /// <summary>Decodes bytes as UTF-8, or as Latin-1 where they are not UTF-8, up to the first zero.</summary>
    public static string Decode(ReadOnlySpan<byte> bytes)
    {
        int end = bytes.IndexOf((byte)0);
        if (end >= 0)
            bytes = bytes[..end];
        if (bytes.StartsWith(Encoding.UTF8.Preamble))
            bytes = bytes[3..];
        try
        {
            return new UTF8Encoding(false, throwOnInvalidBytes: true).GetString(bytes);
        }
        catch (DecoderFallbackException)
        {
            return Encoding.Latin1.GetString(bytes);
        }
    }

    /// <summary>Index of the reader's node: of the first letter of a name, or of a text.</summary>
    public int At(IXmlLineInfo place) => lineStarts[place.LineNumber - 1] + place.LinePosition - 1;

    /// <summary>The value of the attribute whose name starts at an index, without its quotes.</summary>
    public TextSpan AttributeValue(int nameAt)
    {
        int open = Text.IndexOfAny(['"', '\''], nameAt);
        return new TextSpan(open + 1, Text.IndexOf(Text[open], open + 1) - open - 1);
    }

    /// <summary>Index after the end of the tag in which an index lies.</summary>
    public int AfterTag(int inside)
    {
        for (int i = inside; ; i++)
        {
            if (Text[i] == '>')
                return i + 1;
            if (Text[i] is '"' or '\'')
                i = Text.IndexOf(Text[i], i + 1);
        }
    }

    /// <summary>The text with some pieces replaced; the pieces do not overlap.</summary>
    public string With(IEnumerable<(TextSpan Old, string New)> edits)
    {
        StringBuilder result = new(Text.Length + 4096);
        int at = 0;
        foreach ((TextSpan old, string replacement) in edits.OrderBy(e => e.Old.Start))
        {
            result.Append(Text, at, old.Start - at).Append(replacement);
            at = old.Start + old.Length;
        }

        return result.Append(Text, at, Text.Length - at).ToString();
    }

    /// <summary>Characters that XML 1.0 does not allow become U+FFFD.</summary>
    public static string Allowed(string text)
    {
        StringBuilder result = new(text.Length);
        for (int i = 0; i < text.Length; i++)
        {
            if (i + 1 < text.Length && char.IsSurrogatePair(text[i], text[i + 1]))
                result.Append(text[i]).Append(text[++i]);
            else
                result.Append(XmlConvert.IsXmlChar(text[i]) ? text[i] : '\uFFFD');
        }

        return result.ToString();
    }
}
