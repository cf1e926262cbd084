using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>An input and where its result goes.</summary>
/// <param name="Input">Path as given.</param>
/// <param name="Format">Format of the input; null when <paramref name="Fault"/> says why it is unknown.</param>
/// <param name="OutputFormat">Format of the output; null where the input has a fault.</param>
/// <param name="Output">Path of the output; empty where the input has a fault.</param>
/// <param name="Fault">What is wrong with the input; null when its format is known.</param>
public sealed record NamedOutput(string Input, CatalogueFormat? Format, CatalogueFormat? OutputFormat, string Output, StacksException? Fault);

/// <summary>
/// Names one output for every input and refuses, before anything starts, names that would overwrite an input or each
/// other. An input that is missing or of no known format keeps its place with its fault, so that the others still run.
/// </summary>
public static class OutputNaming
{
    /// <summary>Names the outputs; creates nothing.</summary>
    /// <param name="inputs">Input paths, one or more.</param>
    /// <param name="target">
    /// What follows <c>-o</c>: a folder, or a file name when there is one input; its ending decides the format where the
    /// recipe does not.
    /// </param>
    /// <param name="recipe">The recipe: its output format and compression.</param>
    /// <param name="catalogue">The formats.</param>
    /// <exception cref="RecipeException">The recipe's output format is not installed.</exception>
    /// <exception cref="UsageException">A file name for several inputs, or one whose ending belongs to another format.</exception>
    /// <exception cref="OutputException">Two outputs of one name, or an output that is an input.</exception>
    public static IReadOnlyList<NamedOutput> Name(IReadOnlyList<string> inputs, string target, Recipe recipe, PluginCatalogue catalogue)
    {
        CatalogueFormat? asked = OutputFormat(recipe, catalogue);
        string? file = FileTarget(inputs, target, catalogue);
        List<NamedOutput> named = [];
        foreach (string input in inputs)
        {
            try
            {
                CatalogueFormat found = FormatFinder.Of(input, catalogue);
                CatalogueFormat output = asked ?? (file is null ? found : catalogue.Formats.First(f => FormatNames.Carries(file, f.Format)));
                IStackFormat format = output.Format;
                if (file is not null)
                    CheckEnding(file, format);
                named.Add(new NamedOutput(input, found, output, file ?? Path.Combine(target, FileName(input, format, recipe.Output.Compression != OutputCompression.None, catalogue)), null));
            }
            catch (StacksException fault) when (fault is InputMissingException or StackFormatException or StackIOException)
            {
                named.Add(new NamedOutput(input, null, null, "", fault));
            }
        }

        RefuseClashes(named);
        return named;
    }

    /// <summary>The format that the recipe asks for; null for the input's.</summary>
    /// <exception cref="RecipeException">It is not installed.</exception>
    internal static CatalogueFormat? OutputFormat(Recipe recipe, PluginCatalogue catalogue)
    {
        if (recipe.Output.Format is not { } id)
            return null;
        return catalogue.Format(id) ?? throw new RecipeException(recipe.Output.FormatPlace.ToString(), $"unknown output format {id}",
            NearestWord.Remedy(id, ["same", .. catalogue.Formats.Select(f => f.Format.Id)]));
    }

    /// <summary>
    /// The input's name with the ending of the output's format. Wrapped inputs (<c>.gz</c>, <c>.fz</c>) are written
    /// plain; a <c>.fz</c> stays where the same format is to be compressed.
    /// </summary>
    internal static string FileName(string input, IStackFormat format, bool compress, PluginCatalogue catalogue)
    {
        string name = Path.GetFileName(input);
        string plain = FormatNames.Unwrapped(name);
        if (FormatNames.EndingOf(plain, format) is not null)
            return compress && name.EndsWith(".fz", StringComparison.OrdinalIgnoreCase) ? name : plain;
        string? other = catalogue.Formats.Select(f => FormatNames.EndingOf(plain, f.Format)).FirstOrDefault(e => e is not null);
        return plain[..^(other?.Length ?? 0)] + format.Extension;
    }

    private static string? FileTarget(IReadOnlyList<string> inputs, string target, PluginCatalogue catalogue)
    {
        if (Directory.Exists(target) || Path.EndsInDirectorySeparator(target) || !catalogue.Formats.Any(f => FormatNames.Carries(target, f.Format)))
            return null;
        return inputs.Count == 1
            ? target
            : throw new UsageException($"-o {target}", $"names one file for {inputs.Count} inputs", "name a folder");
    }

    private static void CheckEnding(string file, IStackFormat format)
    {
        if (!FormatNames.Carries(file, format))
        {
            throw new UsageException($"-o {file}", $"the recipe asks for {format.Id.ToUpperInvariant()}, and the name's ending promises another format",
                $"end the name with {format.Extension}, or leave [output] format out of the recipe");
        }
    }

    private static void RefuseClashes(List<NamedOutput> named)
    {
        Dictionary<string, string> inputs = [];
        foreach (NamedOutput item in named)
            inputs.TryAdd(RealPath.Of(item.Input), item.Input);
        Dictionary<string, string> outputs = [];
        foreach (NamedOutput item in named.Where(n => n.Fault is null))
        {
            string real = RealPath.Of(item.Output);
            if (inputs.TryGetValue(real, out string? input))
                throw new OutputException(item.Output, $"would overwrite the input {input}", "give -o another folder");
            if (!outputs.TryAdd(real, item.Input))
            {
                throw new OutputException(item.Output, $"would be the output of both {outputs[real]} and {item.Input}",
                    "run inputs of one name into different folders");
            }
        }
    }
}
