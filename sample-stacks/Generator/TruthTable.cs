using System.Globalization;
using System.Text;

namespace Stacks.SampleStacks;

/// <summary>A tab-separated table: one header line whose column names end in their unit, then rows.</summary>
/// <param name="columns">Column names.</param>
internal sealed class TruthTable(params string[] columns)
{
    private readonly StringBuilder text = new StringBuilder().AppendJoin('\t', columns).Append('\n');

    /// <summary>Adds a row; its cells are texts from <see cref="Number(double, int)"/> or words.</summary>
    public void Add(params string[] cells)
    {
        if (cells.Length != columns.Length)
            throw new ArgumentException($"{cells.Length} cells for {columns.Length} columns", nameof(cells));
        text.AppendJoin('\t', cells).Append('\n');
    }

    /// <summary>A number with a fixed count of decimals, the same text everywhere.</summary>
    public static string Number(double value, int decimals) =>
        value.ToString("F" + decimals.ToString(CultureInfo.InvariantCulture), CultureInfo.InvariantCulture);

    /// <summary>A whole number.</summary>
    public static string Number(int value) => value.ToString(CultureInfo.InvariantCulture);

    /// <summary>Writes the table.</summary>
    public void Save(string path) => File.WriteAllText(path, text.ToString());
}
