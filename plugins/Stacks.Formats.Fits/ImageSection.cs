using System.Globalization;
using System.Text.RegularExpressions;

namespace Stacks.Formats.Fits;

/// <summary>
/// A rectangle of an image as headers write it, <c>[x1:x2,y1:y2]</c>: columns and rows from 1, ends included, in either
/// order (common practice).
/// </summary>
/// <param name="Left">First column, from 0.</param>
/// <param name="Top">First row, from 0.</param>
/// <param name="Width">Columns.</param>
/// <param name="Height">Rows.</param>
internal readonly partial record struct ImageSection(long Left, long Top, long Width, long Height)
{
    /// <summary>Reads a section; null when the text is none.</summary>
    public static ImageSection? Parse(string text)
    {
        Match match = Form().Match(text);
        if (!match.Success)
            return null;
        long[] ends = new long[4];
        for (int i = 0; i < ends.Length; i++)
        {
            if (!long.TryParse(match.Groups[i + 1].ValueSpan, NumberStyles.None, CultureInfo.InvariantCulture, out ends[i]) || ends[i] is < 1 or > int.MaxValue)
                return null;
        }

        return new ImageSection(
            Math.Min(ends[0], ends[1]) - 1,
            Math.Min(ends[2], ends[3]) - 1,
            Math.Abs(ends[1] - ends[0]) + 1,
            Math.Abs(ends[3] - ends[2]) + 1);
    }

    /// <summary>True when all of it lies in an image of this size.</summary>
    public bool IsInside(int width, int height) => Left + Width <= width && Top + Height <= height;

    [GeneratedRegex(@"^\s*\[\s*(\d+)\s*:\s*(\d+)\s*,\s*(\d+)\s*:\s*(\d+)\s*\]\s*$")]
    private static partial Regex Form();
}
