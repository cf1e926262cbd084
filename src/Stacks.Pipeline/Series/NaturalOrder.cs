namespace Stacks.Pipeline;

/// <summary>
/// The order that people number files in: runs of digits compare as numbers, all else letter by letter without regard to
/// case, so that frame2 comes before frame10 and Frame3. Names that are alike so far go by fewer leading zeros, then by their
/// code units.
/// </summary>
public sealed class NaturalOrder : IComparer<string>
{
    /// <summary>The only instance.</summary>
    public static NaturalOrder Instance { get; } = new();

    /// <inheritdoc/>
    public int Compare(string? x, string? y)
    {
        ReadOnlySpan<char> left = x, right = y;
        while (left.Length > 0 && right.Length > 0)
        {
            int order;
            if (char.IsAsciiDigit(left[0]) && char.IsAsciiDigit(right[0]))
            {
                ReadOnlySpan<char> first = Digits(ref left).TrimStart('0'), second = Digits(ref right).TrimStart('0');
                order = first.Length != second.Length ? first.Length - second.Length : first.CompareTo(second, StringComparison.Ordinal);
            }
            else
            {
                order = char.ToUpperInvariant(left[0]) - char.ToUpperInvariant(right[0]);
                left = left[1..];
                right = right[1..];
            }

            if (order != 0)
                return order;
        }

        if (left.Length != right.Length)
            return left.Length - right.Length;
        return x?.Length != y?.Length ? (x?.Length ?? 0) - (y?.Length ?? 0) : string.CompareOrdinal(x, y);
    }

    private static ReadOnlySpan<char> Digits(ref ReadOnlySpan<char> text)
    {
        int count = text.IndexOfAnyExceptInRange('0', '9');
        ReadOnlySpan<char> digits = count < 0 ? text : text[..count];
        text = text[digits.Length..];
        return digits;
    }
}
