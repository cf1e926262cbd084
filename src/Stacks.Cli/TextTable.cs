namespace Stacks.Cli;

/// <summary>Left-aligned columns, two spaces apart; the last column runs free.</summary>
internal sealed class TextTable(params string[] header)
{
    private readonly List<string[]> rows = [header];

    /// <summary>Adds a row with as many cells as the header.</summary>
    public void Add(params string[] cells) => rows.Add(cells);

    /// <summary>Writes header and rows.</summary>
    public void Write(TextWriter to, string indent = "")
    {
        int[] widths = [.. Enumerable.Range(0, header.Length).Select(c => rows.Max(r => r[c].Length))];
        foreach (string[] row in rows)
            to.WriteLine(indent + string.Join("  ", row.Select((cell, c) => c < row.Length - 1 ? cell.PadRight(widths[c]) : cell)).TrimEnd());
    }
}
