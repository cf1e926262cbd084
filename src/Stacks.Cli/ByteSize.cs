using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Cli;

/// <summary>Sizes in bytes, read and shown.</summary>
internal static class ByteSize
{
    private static readonly (string Unit, double Bytes)[] Units =
    [
        ("KiB", 1L << 10), ("MiB", 1L << 20), ("GiB", 1L << 30), ("TiB", 1L << 40),
        ("kB", 1e3), ("MB", 1e6), ("GB", 1e9), ("TB", 1e12), ("B", 1),
    ];

    /// <summary>Bytes of a text such as <c>4GiB</c> or <c>512 MB</c>; null for null.</summary>
    /// <exception cref="UsageException">The text is no size above 0.</exception>
    public static long? Parse(string option, string? text)
    {
        if (text is null)
            return null;
        foreach ((string unit, double bytes) in Units)
        {
            if (text.EndsWith(unit, StringComparison.OrdinalIgnoreCase)
                && double.TryParse(text.AsSpan(0, text.Length - unit.Length), NumberStyles.AllowDecimalPoint | NumberStyles.AllowTrailingWhite, CultureInfo.InvariantCulture, out double number)
                && number * bytes is >= 1 and < long.MaxValue)
                return (long)(number * bytes);
        }

        throw new UsageException($"{option} {text}", "is not a size", "give a number and a unit, such as 4GiB or 512MiB");
    }

    /// <summary>Three digits and a binary unit.</summary>
    public static string Show(long bytes)
    {
        int power = 0;
        double number = bytes;
        while (number >= 1000 && power < 4)
        {
            number /= 1024;
            power++;
        }

        string unit = power == 0 ? "B" : Units[power - 1].Unit;
        return string.Create(CultureInfo.InvariantCulture, $"{number:G3} {unit}");
    }
}
