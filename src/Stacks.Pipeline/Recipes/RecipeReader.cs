using System.Globalization;
using System.Text;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// Reads recipes: TOML with exactly the keys listed here. Keys of a filter are checked later, against the filter's own
/// declaration, by <see cref="StepBinder"/>.
/// </summary>
public static class RecipeReader
{
    private const int LargestFile = 1 << 20;

    /// <summary>Reads a recipe file.</summary>
    /// <exception cref="InputMissingException">There is no such file.</exception>
    /// <exception cref="RecipeException">The file is not a recipe; the message starts with file, line and column.</exception>
    /// <exception cref="StackIOException">The file cannot be read.</exception>
    public static Recipe Read(string path)
    {
        if (!File.Exists(path))
        {
            throw Directory.Exists(path)
                ? new RecipeException(path, "is a folder", "name a recipe file")
                : new InputMissingException(path, "no such recipe", "check the path");
        }

        try
        {
            if (new FileInfo(path).Length > LargestFile)
                throw new RecipeException(path, "is larger than 1 MiB", "name a recipe file: a short TOML text");
            return Parse(new UTF8Encoding(false, throwOnInvalidBytes: true).GetString(WithoutMark(File.ReadAllBytes(path))), path);
        }
        catch (DecoderFallbackException e)
        {
            throw new RecipeException(path, "is not UTF-8 text", "name a recipe file: a TOML text", e);
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            throw new StackIOException(path, "cannot be read: " + e.Message.TrimEnd('.'), "check the file's permissions and its disk", e);
        }
    }

    /// <summary>Reads a recipe from text; relative paths in it are resolved against the folder of <paramref name="path"/>.</summary>
    /// <exception cref="RecipeException">The text is not a recipe; the message starts with file, line and column.</exception>
    public static Recipe Parse(string text, string path)
    {
        TableReader root = new TableReader(TomlTree.Parse(text, path), "the recipe")
            .Allow("title", "input", "noise", "step", "output");
        string folder = Path.GetDirectoryName(Path.GetFullPath(path))!;
        return new Recipe
        {
            Path = path,
            Title = root.Text("title") ?? "",
            Input = root.Table("input") is { } input ? Input(input, folder) : new InputSection(),
            Noise = NoiseTables(root.Tables("noise", singleAllowed: true), folder),
            Steps = [.. root.Tables("step", singleAllowed: false).Select(Step)],
            Output = root.Table("output") is { } output ? Output(output) : new OutputSection(),
        };
    }

    private static InputSection Input(TableReader table, string folder)
    {
        table.Allow("mosaic", "mask", "defects", "extensions", "saturation");
        return new InputSection
        {
            Mosaic = table.Text("mosaic") is { } mosaic ? Mosaic(table, mosaic) : null,
            Mask = table.Text("mask") is { } mask ? Path.Combine(folder, mask) : null,
            Defects = table.Text("defects") is { } defects ? Path.Combine(folder, defects) : null,
            Extensions = table.Texts("extensions"),
            Saturation = table.Number("saturation", "a finite number, in the unit of the values", _ => true),
        };
    }

    private static Lattice? Mosaic(TableReader table, string text)
    {
        if (text == "header")
            return null;
        if (text == "none")
            return Lattice.Single;
        string[] sides = text.Split('x');
        return sides.Length == 2 && Side(sides[0], out int x) && Side(sides[1], out int y)
            ? new Lattice(x, y)
            : throw table.Error("mosaic", $"mosaic in [input] cannot be \"{text}\"", "give \"header\" | \"none\" | \"NxM\" with periods of 1 to 16, such as \"2x2\"");
    }

    private static bool Side(string text, out int side) =>
        int.TryParse(text, NumberStyles.None, CultureInfo.InvariantCulture, out side) && side is >= 1 and <= 16;

    private static List<NoiseSection> NoiseTables(IReadOnlyList<TableReader> tables, string folder)
    {
        List<NoiseSection> sections = [];
        foreach (TableReader table in tables)
        {
            NoiseSection section = Noise(table, folder);
            if (sections.Any(s => s.Channel == section.Channel))
            {
                string channel = section.Channel is null ? "all channels" : $"channel {section.Channel}";
                throw table.Error("channel", $"a second noise table for {channel}", "keep one of them, or give each its own channel = ...");
            }

            sections.Add(section);
        }

        return sections;
    }

    private static NoiseSection Noise(TableReader table, string folder)
    {
        table.Allow("from", "channel", "gain", "read_noise", "pedestal", "sigma", "file");
        NoiseSection section = new()
        {
            Place = table.Place,
            Channel = table.Channel("channel"),
            From = table.Word("from", "values", "header", "file", "frame") switch
            {
                "values" => NoiseOrigin.Values,
                "header" => NoiseOrigin.Header,
                "file" => NoiseOrigin.File,
                "frame" => NoiseOrigin.Frame,
                _ => throw table.Error("from", "a noise table must say where the noise model comes from",
                    "add from = \"values\" | \"header\" | \"frame\""),
            },
            Gain = table.Number("gain", "a number above 0 (e-/ADU)", n => n > 0),
            ReadNoise = table.Number("read_noise", "a number, 0 or more (e-)", n => n >= 0),
            Pedestal = table.Number("pedestal", "a finite number (ADU)", _ => true),
            Sigma = table.Number("sigma", "a number above 0, in the unit of the values", n => n > 0),
            File = table.Text("file") is { } file ? Path.Combine(folder, file) : null,
        };
        NoiseRules.Check(section, table);
        return section;
    }

    private static StepSection Step(TableReader table)
    {
        if (!table.Has("filter"))
            throw table.Error("filter", "a step must name its filter", "add filter = \"...\"; the verb filters lists the installed ones");
        return new StepSection
        {
            Place = table.Place,
            Filter = table.Text("filter")!,
            FilterPlace = table.PlaceOf("filter"),
            Channel = table.Channel("channel"),
            ChannelPlace = table.PlaceOf("channel"),
            Parameters = table.Others("filter", "channel"),
            Places = table.OtherPlaces("filter", "channel"),
        };
    }

    private static OutputSection Output(TableReader table)
    {
        table.Allow("samples", "format", "compression", "mask", "carry");
        string? format = table.Text("format");
        return new OutputSection
        {
            Samples = table.Word("samples", "auto", "same", "float32", "float64") switch
            {
                "same" => SampleChoice.Same,
                "float32" => SampleChoice.Float32,
                "float64" => SampleChoice.Float64,
                _ => SampleChoice.Auto,
            },
            SamplesPlace = table.PlaceOf("samples"),
            Format = format == "same" ? null : format,
            FormatPlace = table.PlaceOf("format"),
            Compression = table.Word("compression", "none", "lossless", "deflate", "zstd") switch
            {
                "lossless" => OutputCompression.Lossless,
                "deflate" => OutputCompression.Deflate,
                "zstd" => OutputCompression.Zstd,
                _ => OutputCompression.None,
            },
            CompressionPlace = table.PlaceOf("compression"),
            Mask = table.Switch("mask"),
            Carry = table.Switch("carry") ?? true,
        };
    }

    private static ReadOnlySpan<byte> WithoutMark(byte[] bytes) =>
        bytes.AsSpan(bytes.AsSpan().StartsWith("\uFEFF"u8) ? 3 : 0);
}
