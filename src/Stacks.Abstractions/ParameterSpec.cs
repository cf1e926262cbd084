using System.Globalization;

namespace Stacks.Abstractions;

/// <summary>What a parameter's value looks like in a recipe.</summary>
public enum ParameterKind
{
    /// <summary>A real number.</summary>
    Number,

    /// <summary>A whole number.</summary>
    Integer,

    /// <summary>An odd whole number: the side of a window.</summary>
    OddInteger,

    /// <summary>true or false.</summary>
    Switch,

    /// <summary>One of <see cref="ParameterSpec.Words"/>.</summary>
    Choice,

    /// <summary>A list of numbers.</summary>
    Numbers,
}

/// <summary>
/// The one declaration of a filter parameter: help, recipe validation, provenance, documentation and tests read it.
/// </summary>
public sealed record ParameterSpec
{
    /// <summary>Key in the recipe, lower_snake_case.</summary>
    public required string Name { get; init; }

    /// <summary>Shape of the value.</summary>
    public required ParameterKind Kind { get; init; }

    /// <summary>Unit as shown to the user (<c>px</c>, <c>noise sigmas</c>); empty where there is none.</summary>
    public string Unit { get; init; } = "";

    /// <summary>Default; null when the recipe must state the parameter.</summary>
    public ParameterValue? Default { get; init; }

    /// <summary>Smallest number allowed, inclusive.</summary>
    public double Minimum { get; init; } = double.NegativeInfinity;

    /// <summary>Largest number allowed, inclusive.</summary>
    public double Maximum { get; init; } = double.PositiveInfinity;

    /// <summary>Words allowed: the choices, or words that may stand in place of a number (<c>mean-gradient</c>).</summary>
    public IReadOnlyList<string> Words { get; init; } = [];

    /// <summary>True when a number may also be given as a per cent of the image diagonal (<c>"2%"</c>).</summary>
    public bool AllowsPercent { get; init; }

    /// <summary>What the parameter is, in one sentence.</summary>
    public required string Meaning { get; init; }

    /// <summary>What raising it does; for switches and choices, what turning it on or changing it does.</summary>
    public required string WhenRaised { get; init; }

    /// <summary>What lowering it does.</summary>
    public required string WhenLowered { get; init; }

    /// <summary>The range as shown to the user: <c>0.1 to 100</c>, <c>odd, 3 to 31</c>, <c>both | bright | dark</c>.</summary>
    public string Range
    {
        get
        {
            string words = string.Join(" | ", Words);
            if (Kind == ParameterKind.Switch)
                return "true | false";
            if (Kind == ParameterKind.Choice)
                return words;
            string low = Format(Minimum), high = Format(Maximum);
            string range = (double.IsInfinity(Minimum), double.IsInfinity(Maximum)) switch
            {
                (false, false) => $"{low} to {high}",
                (false, true) => $"{low} or more",
                (true, false) => $"{high} or less",
                _ => "any",
            };
            if (Kind == ParameterKind.OddInteger)
                range = "odd, " + range;
            if (AllowsPercent)
                range += " | \"n%\"";
            return Words.Count > 0 ? $"{range} | {words}" : range;
        }
    }

    /// <summary>Checks a value against kind, range and words.</summary>
    /// <exception cref="ParameterException">The value is not allowed; the message says what is.</exception>
    public void Check(ParameterValue value)
    {
        bool good = Kind switch
        {
            ParameterKind.Switch => value.Form == ParameterForm.Switch,
            ParameterKind.Choice => value.Form == ParameterForm.Word && Words.Contains(value.Word),
            ParameterKind.Numbers => value.Form == ParameterForm.Numbers && value.Numbers.Count > 0 && value.Numbers.All(InRange),
            _ => value.Form switch
            {
                ParameterForm.Number => InRange(value.Number) && IsWholeEnough(value.Number),
                ParameterForm.Percent => AllowsPercent && value.Number > 0,
                ParameterForm.Word => Words.Contains(value.Word),
                _ => false,
            },
        };
        if (!good)
            throw new ParameterException(Name, $"{value} is not allowed", $"give {Range}{(Unit.Length > 0 ? $" ({Unit})" : "")}");
    }

    private bool InRange(double number) => number >= Minimum && number <= Maximum && double.IsFinite(number);

    private bool IsWholeEnough(double number) => Kind switch
    {
        ParameterKind.Integer => Math.Floor(number) == number,
        ParameterKind.OddInteger => Math.Floor(number) == number && number % 2 != 0,
        _ => true,
    };

    private static string Format(double number) => number.ToString("R", CultureInfo.InvariantCulture);
}
