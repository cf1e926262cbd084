using System.Globalization;

namespace Stacks.Abstractions;

/// <summary>Which of its forms a <see cref="ParameterValue"/> has.</summary>
public enum ParameterForm
{
    /// <summary>A number.</summary>
    Number,

    /// <summary>A per cent of the image diagonal.</summary>
    Percent,

    /// <summary>A word.</summary>
    Word,

    /// <summary>true or false.</summary>
    Switch,

    /// <summary>A list of numbers.</summary>
    Numbers,
}

/// <summary>A parameter's value as a recipe gives it.</summary>
public sealed record ParameterValue
{
    private ParameterValue(ParameterForm form) => Form = form;

    /// <summary>Which form the value has.</summary>
    public ParameterForm Form { get; }

    /// <summary>The number or the per cent; 0 in the other forms.</summary>
    public double Number { get; private init; }

    /// <summary>The word; empty in the other forms.</summary>
    public string Word { get; private init; } = "";

    /// <summary>The switch; false in the other forms.</summary>
    public bool Switch { get; private init; }

    /// <summary>The list; empty in the other forms.</summary>
    public IReadOnlyList<double> Numbers { get; private init; } = [];

    /// <summary>A number.</summary>
    public static ParameterValue Of(double number) => new(ParameterForm.Number) { Number = number };

    /// <summary>A switch.</summary>
    public static ParameterValue Of(bool state) => new(ParameterForm.Switch) { Switch = state };

    /// <summary>A list of numbers.</summary>
    public static ParameterValue Of(IReadOnlyList<double> numbers) => new(ParameterForm.Numbers) { Numbers = numbers };

    /// <summary>A word, or a per cent when the text is a number followed by <c>%</c>.</summary>
    public static ParameterValue Of(string text)
    {
        if (text.EndsWith('%')
            && double.TryParse(text.AsSpan(0, text.Length - 1), NumberStyles.Float, CultureInfo.InvariantCulture, out double percent))
            return new ParameterValue(ParameterForm.Percent) { Number = percent };
        return new ParameterValue(ParameterForm.Word) { Word = text };
    }

    /// <summary>The value as a recipe would give it, numbers so that they read back exactly.</summary>
    public override string ToString() => Form switch
    {
        ParameterForm.Number => Number.ToString("R", CultureInfo.InvariantCulture),
        ParameterForm.Percent => Number.ToString("R", CultureInfo.InvariantCulture) + "%",
        ParameterForm.Switch => Switch ? "true" : "false",
        ParameterForm.Numbers => "[" + string.Join(", ", Numbers.Select(n => n.ToString("R", CultureInfo.InvariantCulture))) + "]",
        _ => Word,
    };
}

/// <summary>The checked values of all parameters of one step; those the recipe leaves out stand at their defaults.</summary>
public sealed class ParameterValues
{
    private readonly Dictionary<string, ParameterValue> values = new(StringComparer.Ordinal);

    /// <summary>Checks the given values against the specs and fills in the defaults.</summary>
    /// <exception cref="ParameterException">Unknown name, value not allowed, or a parameter without default left out.</exception>
    public ParameterValues(IReadOnlyList<ParameterSpec> specs, IReadOnlyDictionary<string, ParameterValue> given)
    {
        foreach (string name in given.Keys)
        {
            if (!specs.Any(s => s.Name == name))
                throw new ParameterException(name, "unknown parameter", $"known are {string.Join(", ", specs.Select(s => s.Name))}");
        }

        foreach (ParameterSpec spec in specs)
        {
            ParameterValue value = given.GetValueOrDefault(spec.Name) ?? spec.Default
                ?? throw new ParameterException(spec.Name, "must be stated", $"{spec.Meaning}; give {spec.Range} {spec.Unit}".TrimEnd());
            spec.Check(value);
            values[spec.Name] = value;
        }
    }

    /// <summary>The value of a declared parameter.</summary>
    public ParameterValue this[string name] => values[name];

    /// <summary>The number of a declared parameter.</summary>
    public double Number(string name) => values[name].Number;

    /// <summary>The whole number of a declared parameter.</summary>
    public int Integer(string name) => (int)values[name].Number;

    /// <summary>The state of a declared switch.</summary>
    public bool Switch(string name) => values[name].Switch;

    /// <summary>The word of a declared choice.</summary>
    public string Word(string name) => values[name].Word;
}

/// <summary>A parameter as it takes effect on one kind of frame: per cent turned to pixels, lengths divided by the pitch.</summary>
/// <param name="Name">Name of the parameter.</param>
/// <param name="Value">The resolved value, invariant culture, round-trip precision.</param>
/// <param name="Unit">Unit, or empty.</param>
public sealed record ResolvedParameter(string Name, string Value, string Unit);
