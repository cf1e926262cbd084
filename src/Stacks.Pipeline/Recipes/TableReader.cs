using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Reads the keys of one table: each getter names what is allowed when a value is not.</summary>
/// <param name="table">The table.</param>
/// <param name="name">Its name in errors: <c>[noise]</c>.</param>
internal sealed class TableReader(TomlTable table, string name)
{
    /// <summary>Place of the table.</summary>
    public RecipePlace Place => table.Place;

    /// <summary>True when the key is there.</summary>
    public bool Has(string key) => table.Entries.ContainsKey(key);

    /// <summary>Place of a key, or of the table where the key is absent.</summary>
    public RecipePlace PlaceOf(string key) => table.Entries.TryGetValue(key, out TomlEntry? entry) ? entry.KeyPlace : table.Place;

    /// <summary>Refuses keys that are not in the list.</summary>
    /// <exception cref="RecipeException">An unknown key, with its place, the nearest known one and all known ones.</exception>
    public TableReader Allow(params string[] known)
    {
        foreach ((string key, TomlEntry entry) in table.Entries)
        {
            if (!known.Contains(key))
                throw new RecipeException(entry.KeyPlace.ToString(), $"unknown key {key} in {name}", NearestWord.Remedy(key, known));
        }

        return this;
    }

    /// <summary>A text; null when the key is absent.</summary>
    public string? Text(string key)
    {
        if (!table.Entries.TryGetValue(key, out TomlEntry? entry))
            return null;
        return entry.Value is string { Length: > 0 } text ? text : throw Wrong(key, entry, "text in quotes");
    }

    /// <summary>One of some words; null when the key is absent.</summary>
    public string? Word(string key, params string[] words)
    {
        if (!table.Entries.TryGetValue(key, out TomlEntry? entry))
            return null;
        return entry.Value is string word && words.Contains(word)
            ? word
            : throw Wrong(key, entry, string.Join(" | ", words.Select(w => $"\"{w}\"")));
    }

    /// <summary>A finite number that satisfies a condition; null when the key is absent.</summary>
    public double? Number(string key, string allowed, Func<double, bool> condition)
    {
        if (!table.Entries.TryGetValue(key, out TomlEntry? entry))
            return null;
        double number = entry.Value switch
        {
            double real => real,
            long whole => whole,
            _ => throw Wrong(key, entry, allowed),
        };
        return double.IsFinite(number) && condition(number) ? number : throw Wrong(key, entry, allowed);
    }

    /// <summary>true or false; null when the key is absent.</summary>
    public bool? Switch(string key)
    {
        if (!table.Entries.TryGetValue(key, out TomlEntry? entry))
            return null;
        return entry.Value is bool state ? state : throw Wrong(key, entry, "true | false");
    }

    /// <summary>A list of texts; null when the key is absent.</summary>
    public IReadOnlyList<string>? Texts(string key)
    {
        if (!table.Entries.TryGetValue(key, out TomlEntry? entry))
            return null;
        if (entry.Value is not List<TomlEntry> { Count: > 0 } items)
            throw Wrong(key, entry, "a list of texts, [\"A\", \"B\"]");
        return [.. items.Select(i => i.Value as string ?? throw Wrong(key, i, "a text in quotes"))];
    }

    /// <summary>A channel: a whole number from 0, or a name; null when the key is absent.</summary>
    public string? Channel(string key)
    {
        if (!table.Entries.TryGetValue(key, out TomlEntry? entry))
            return null;
        return entry.Value switch
        {
            string { Length: > 0 } channel => channel,
            long and >= 0 => ((long)entry.Value).ToString(CultureInfo.InvariantCulture),
            _ => throw Wrong(key, entry, "a channel's number from 0, or its name in quotes"),
        };
    }

    /// <summary>The keys that are not in the list, as parameter values.</summary>
    public IReadOnlyDictionary<string, ParameterValue> Others(params string[] known) =>
        table.Entries.Where(e => !known.Contains(e.Key)).ToDictionary(e => e.Key, e => Parameter(e.Key, e.Value));

    /// <summary>Places of the keys that are not in the list.</summary>
    public IReadOnlyDictionary<string, RecipePlace> OtherPlaces(params string[] known) =>
        table.Entries.Where(e => !known.Contains(e.Key)).ToDictionary(e => e.Key, e => e.Value.KeyPlace);

    /// <summary>A table below this one; null when the key is absent.</summary>
    public TableReader? Table(string key)
    {
        if (!table.Entries.TryGetValue(key, out TomlEntry? entry))
            return null;
        return entry.Value is TomlTable child ? new TableReader(child, $"[{key}]") : throw Wrong(key, entry, $"a table: write [{key}]");
    }

    /// <summary>Tables below this one: <c>[[key]]</c>, or a single <c>[key]</c> when that is allowed.</summary>
    public IReadOnlyList<TableReader> Tables(string key, bool singleAllowed)
    {
        if (!table.Entries.TryGetValue(key, out TomlEntry? entry))
            return [];
        return entry.Value switch
        {
            TomlTable child when singleAllowed => [new TableReader(child, $"[{key}]")],
            List<TomlEntry> { Count: > 0 } list when list.All(i => i.Value is TomlTable) =>
                [.. list.Select(i => new TableReader((TomlTable)i.Value, $"[[{key}]]"))],
            _ => throw Wrong(key, entry, $"a list of tables: write [[{key}]]"),
        };
    }

    /// <summary>An error about a key, at its place.</summary>
    public RecipeException Error(string key, string what, string remedy) => new(PlaceOf(key).ToString(), what, remedy);

    private ParameterValue Parameter(string key, TomlEntry entry) => entry.Value switch
    {
        string text => ParameterValue.Of(text),
        long whole => ParameterValue.Of((double)whole),
        double real => ParameterValue.Of(real),
        bool state => ParameterValue.Of(state),
        List<TomlEntry> { Count: > 0 } list => ParameterValue.Of([.. list.Select(i => i.Value switch
        {
            long whole => (double)whole,
            double real => real,
            _ => throw Wrong(key, i, "a list of numbers"),
        })]),
        _ => throw Wrong(key, entry, "a number, a text, true | false, or a list of numbers"),
    };

    private RecipeException Wrong(string key, TomlEntry entry, string allowed)
    {
        string got = entry.Value switch
        {
            string text => $"\"{text}\"",
            IFormattable number => number.ToString(null, CultureInfo.InvariantCulture),
            bool state => state ? "true" : "false",
            _ => entry.Kind,
        };
        return new RecipeException(entry.Place.ToString(), $"{key} in {name} cannot be {got}", $"give {allowed}");
    }
}
