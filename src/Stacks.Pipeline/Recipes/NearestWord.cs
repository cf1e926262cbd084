namespace Stacks.Pipeline;

/// <summary>Suggestions for misspelt words.</summary>
public static class NearestWord
{
    /// <summary>
    /// <c>did you mean X? </c> before a list of all known words, when one is near enough: about a third of its
    /// letters changed at most, by edit distance (Levenshtein 1966).
    /// </summary>
    public static string Remedy(string word, IReadOnlyCollection<string> known)
    {
        string list = known.Count == 0 ? "there are none" : "known are " + string.Join(", ", known);
        string? nearest = known.MinBy(k => Distance(word, k));
        return nearest is not null && Distance(word, nearest) <= Math.Max(1, (nearest.Length + 1) / 3)
            ? $"did you mean {nearest}? {list}"
            : list;
    }

    /// <summary>Letters to insert, delete or replace to turn one word into the other.</summary>
    internal static int Distance(string a, string b)
    {
        int[] row = [.. Enumerable.Range(0, b.Length + 1)];
        for (int i = 1; i <= a.Length; i++)
        {
            int diagonal = row[0];
            row[0] = i;
            for (int j = 1; j <= b.Length; j++)
            {
                int replaced = diagonal + (a[i - 1] == b[j - 1] ? 0 : 1);
                diagonal = row[j];
                row[j] = Math.Min(replaced, Math.Min(row[j], row[j - 1]) + 1);
            }
        }

        return row[^1];
    }
}
