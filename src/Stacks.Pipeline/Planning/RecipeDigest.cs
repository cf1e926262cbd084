using System.Globalization;
using System.Security.Cryptography;
using System.Text;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// SHA-256 of a recipe as it takes effect: defaults written out, files by their content. Comments, order of keys, title
/// and layout of the file do not count.
/// </summary>
internal static class RecipeDigest
{
    /// <summary>The digest, lower-case hex.</summary>
    public static string Of(Recipe recipe, IReadOnlyList<PlannedStep> steps) =>
        Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(Canonical(recipe, steps))));

    /// <summary>The text that is digested: a line for each setting, in a fixed order.</summary>
    internal static string Canonical(Recipe recipe, IReadOnlyList<PlannedStep> steps)
    {
        StringBuilder text = new("recipe 1\n");
        InputSection input = recipe.Input;
        Line(text, "mosaic", input.Mosaic is { } m ? string.Create(CultureInfo.InvariantCulture, $"{m.PeriodX}x{m.PeriodY}") : "header");
        Line(text, "mask", FileDigest(input.Mask));
        Line(text, "defects", FileDigest(input.Defects));
        Line(text, "extensions", input.Extensions is null ? "" : string.Join('\u001f', input.Extensions));
        Line(text, "saturation", Number(input.Saturation));
        foreach (NoiseSection noise in recipe.Noise)
        {
            Line(text, "noise", noise.From.ToString());
            Line(text, "channel", noise.Channel ?? "");
            Line(text, "gain", Number(noise.Gain));
            Line(text, "read_noise", Number(noise.ReadNoise));
            Line(text, "pedestal", Number(noise.Pedestal));
            Line(text, "sigma", Number(noise.Sigma));
        }

        foreach (PlannedStep step in steps)
        {
            Line(text, "step", step.Section.Filter);
            Line(text, "channel", step.Section.Channel ?? "");
            foreach (ParameterSpec spec in step.Filter.Plugin.Parameters)
                Line(text, spec.Name, step.Values[spec.Name].ToString());
        }

        OutputSection output = recipe.Output;
        Line(text, "samples", output.Samples.ToString());
        Line(text, "format", output.Format ?? "same");
        Line(text, "compress", output.Compression switch
        {
            OutputCompression.None => "none",
            OutputCompression.Lossless => "lossless",
            OutputCompression.Deflate => "deflate",
            _ => "zstd",
        });
        Line(text, "carry", output.Carry ? "true" : "false");
        Line(text, "write mask", output.Mask?.ToString() ?? "auto");
        return text.ToString();
    }

    private static void Line(StringBuilder text, string name, string value) => text.Append(name).Append('\t').Append(value).Append('\n');

    private static string Number(double? value) => value?.ToString("R", CultureInfo.InvariantCulture) ?? "";

    private static string FileDigest(string? path)
    {
        if (path is null)
            return "";
        using FileStream file = File.OpenRead(path);
        return Convert.ToHexStringLower(SHA256.HashData(file));
    }
}
