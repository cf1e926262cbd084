using System.Collections.Frozen;
using Stacks.Abstractions;
using Tomlyn;
using Tomlyn.Parsing;

namespace Stacks.Pipeline;

/// <summary>A value of a TOML file with the places of its key and of itself.</summary>
/// <param name="KeyPlace">Where the key stands.</param>
/// <param name="Place">Where the value stands.</param>
/// <param name="Value"><see cref="string"/>, <see cref="long"/>, <see cref="double"/>, <see cref="bool"/>,
/// <see cref="TomlTable"/>, <see cref="TomlDate"/> or a list of <see cref="TomlEntry"/>.</param>
internal sealed record TomlEntry(RecipePlace KeyPlace, RecipePlace Place, object Value)
{
    private static readonly FrozenDictionary<Type, string> Kinds = new Dictionary<Type, string>
    {
        [typeof(string)] = "text",
        [typeof(long)] = "a whole number",
        [typeof(double)] = "a number",
        [typeof(bool)] = "true or false",
        [typeof(TomlTable)] = "a table",
        [typeof(TomlDate)] = "a date",
        [typeof(List<TomlEntry>)] = "a list",
    }.ToFrozenDictionary();

    /// <summary>The kind of value in a user's words.</summary>
    public string Kind => Kinds[Value.GetType()];
}

/// <summary>A date or time; no recipe key takes one.</summary>
internal sealed record TomlDate;

/// <summary>A table: its keys in the order in which they stand.</summary>
internal sealed class TomlTable
{
    /// <summary>Where its first key stands, or where it ends when it has none.</summary>
    public RecipePlace Place { get; set; }

    /// <summary>The keys.</summary>
    public Dictionary<string, TomlEntry> Entries { get; } = new(StringComparer.Ordinal);
}

/// <summary>
/// Reads TOML into tables that know where everything stands. The library's own mapping to objects passes over unknown
/// keys, and a key misspelt in a recipe must not silently fall back to its default.
/// </summary>
internal static class TomlTree
{
    /// <summary>The root table of a text.</summary>
    /// <exception cref="RecipeException">The text is not TOML, or defines something twice.</exception>
    public static TomlTable Parse(string text, string file)
    {
        try
        {
            SyntaxParser.ParseStrict(text, file, validate: true);
            Walker walker = new(TomlParser.Create(text), file);
            return walker.Document();
        }
        catch (TomlException e)
        {
            RecipePlace place = new(file, e.Line ?? 1, e.Column ?? 1);
            throw new RecipeException(place.ToString(), FirstLine(e.Message), "correct the line; recipes are TOML 1.0", e);
        }
    }

    private static string FirstLine(string message)
    {
        string line = message.Split('\n', 2)[0].TrimEnd('.', ' ', '\r');
        const string mark = "error : ";
        int start = line.IndexOf(mark, StringComparison.Ordinal);
        return "not valid TOML: " + (start < 0 ? line : line[(start + mark.Length)..]);
    }

    private sealed class Walker(TomlParser parser, string file)
    {
        private RecipePlace last = new(file, 1, 1);

        public TomlTable Document()
        {
            TomlTable root = new();
            Next(); // start of document
            Next(); // start of the root table
            Fill(root);
            return root;
        }

        private void Next()
        {
            if (!parser.MoveNext())
                throw new RecipeException(last.ToString(), "the file ends too early", "complete it");
            if (parser.Current.Span is { } span)
                last = new RecipePlace(file, span.Start.Line + 1, span.Start.Column + 1);
        }

        private void Fill(TomlTable table)
        {
            Next();
            if (table.Place == default)
                table.Place = last;
            for (; parser.Current.Kind == TomlParseEventKind.PropertyName; Next())
            {
                string key = parser.GetPropertyName();
                RecipePlace keyPlace = last;
                Next();
                if (parser.Current.Kind == TomlParseEventKind.StartTable
                    && table.Entries.TryGetValue(key, out TomlEntry? known) && known.Value is TomlTable begun)
                    Fill(begun);
                else
                    table.Entries[key] = new TomlEntry(keyPlace, last, Value());
            }
        }

        private object Value()
        {
            switch (parser.Current.Kind)
            {
                case TomlParseEventKind.String:
                    return parser.GetString();
                case TomlParseEventKind.Integer:
                    return parser.Current.GetInt64();
                case TomlParseEventKind.Float:
                    return parser.Current.GetDouble();
                case TomlParseEventKind.Boolean:
                    return parser.Current.GetBoolean();
                case TomlParseEventKind.StartTable:
                    TomlTable table = new();
                    Fill(table);
                    return table;
                case TomlParseEventKind.StartArray:
                    List<TomlEntry> items = [];
                    for (Next(); parser.Current.Kind != TomlParseEventKind.EndArray; Next())
                    {
                        RecipePlace place = last;
                        items.Add(new TomlEntry(place, place, Value()));
                    }

                    return items;
                default:
                    return new TomlDate();
            }
        }
    }
}
