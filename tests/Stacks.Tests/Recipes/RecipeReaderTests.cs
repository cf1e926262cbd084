using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Recipes;

/// <summary>What a recipe may hold, and what is said about everything else. TOML itself: toml.io, version 1.0.</summary>
public class RecipeReaderTests
{
    private const string Whole = """
        title = "Overnight field, red filter"

        [input]
        mosaic = "2x2"
        mask = "badpixels.fits"
        defects = "/data/defects.fits"
        extensions = ["SCI"]
        saturation = 60000

        [[noise]]
        channel = 1
        from = "values"
        gain = 1.46
        read_noise = 3
        pedestal = 200
        [[noise]]
        channel = "red"
        from = "values"
        sigma = 2.5
        [[noise]]
        from = "header"
        pedestal = -3.5

        [[step]]
        filter = "some-filter"
        channel = 0
        threshold = 5.0
        largest_window = 7
        share = "2%"
        range = "mean-gradient"
        conserve_flux = true
        weights = [1, 2.5, 1]
        [[step]]
        filter = "other"

        [output]
        samples = "float32"
        format = "tiff"
        compression = "lossless"
        mask = false
        """;

    [Fact]
    public void Every_key_is_read()
    {
        Recipe recipe = RecipeReader.Parse(Whole, "/night/recipes/red.toml");

        Assert.Equal("Overnight field, red filter", recipe.Title);
        Assert.Equal(new Lattice(2, 2), recipe.Input.Mosaic);
        Assert.Equal("/night/recipes/badpixels.fits", recipe.Input.Mask);
        Assert.Equal("/data/defects.fits", recipe.Input.Defects);
        Assert.Equal(["SCI"], recipe.Input.Extensions);
        Assert.Equal(60000, recipe.Input.Saturation);

        Assert.Equal(["1", "red", null], recipe.Noise.Select(n => n.Channel));
        Assert.Equal([NoiseOrigin.Values, NoiseOrigin.Values, NoiseOrigin.Header], recipe.Noise.Select(n => n.From));
        Assert.Equal((1.46, 3.0, 200.0, null), (recipe.Noise[0].Gain, recipe.Noise[0].ReadNoise, recipe.Noise[0].Pedestal, recipe.Noise[0].Sigma));
        Assert.Equal(2.5, recipe.Noise[1].Sigma);
        Assert.Equal(-3.5, recipe.Noise[2].Pedestal);

        StepSection step = recipe.Steps[0];
        Assert.Equal(("some-filter", "0"), (step.Filter, step.Channel));
        Assert.Equal(ParameterValue.Of(5.0), step.Parameters["threshold"]);
        Assert.Equal(ParameterValue.Of(7.0), step.Parameters["largest_window"]);
        Assert.Equal((ParameterForm.Percent, 2.0), (step.Parameters["share"].Form, step.Parameters["share"].Number));
        Assert.Equal("mean-gradient", step.Parameters["range"].Word);
        Assert.True(step.Parameters["conserve_flux"].Switch);
        Assert.Equal([1, 2.5, 1], step.Parameters["weights"].Numbers);
        Assert.Equal(new RecipePlace("/night/recipes/red.toml", 27, 1), step.Places["threshold"]);
        Assert.Equal("other", recipe.Steps[1].Filter);

        Assert.Equal((SampleChoice.Float32, "tiff", OutputCompression.Lossless, false), (recipe.Output.Samples, recipe.Output.Format, recipe.Output.Compression, recipe.Output.Mask));
    }

    [Fact]
    public void An_empty_recipe_is_a_recipe_without_steps()
    {
        Recipe recipe = RecipeReader.Parse("# nothing\n", "r.toml");

        Assert.Empty(recipe.Steps);
        Assert.Empty(recipe.Noise);
        Assert.Null(recipe.Input.Mosaic);
        Assert.Null(recipe.Output.Format);
        Assert.Null(recipe.Output.Mask);
    }

    [Theory]
    [InlineData("\"header\"", 0, 0)]
    [InlineData("\"none\"", 1, 1)]
    [InlineData("\"2x2\"", 2, 2)]
    [InlineData("\"6x4\"", 6, 4)]
    public void Mosaic_periods(string text, int x, int y)
    {
        Lattice? expected = x == 0 ? null : new Lattice(x, y);
        Assert.Equal(expected, RecipeReader.Parse($"[input]\nmosaic = {text}", "r.toml").Input.Mosaic);
    }

    [Fact]
    public void A_single_noise_table_is_a_list_of_one()
    {
        NoiseSection noise = Assert.Single(RecipeReader.Parse("[noise]\nfrom = \"frame\"\n", "r.toml").Noise);
        Assert.Equal(NoiseOrigin.Frame, noise.From);
        Assert.Null(noise.Channel);
    }

    [Theory]
    // Unknown keys, at each level, with the nearest known one.
    [InlineData("titel = \"x\"", "r.toml:1:1", "unknown key titel in the recipe; did you mean title? known are title, input, noise, step, output")]
    [InlineData("[inputs]\nmosaic = \"none\"", "r.toml:1:2", "did you mean input?")]
    [InlineData("[input]\n  mosiac = \"none\"", "r.toml:2:3", "unknown key mosiac in [input]; did you mean mosaic?")]
    [InlineData("[noise]\nfrom = \"values\"\nreadnoise = 3", "r.toml:3:1", "did you mean read_noise?")]
    [InlineData("[output]\nzzzzzz = 3", "r.toml:2:1", "unknown key zzzzzz in [output]; known are samples, format, compression, mask")]
    [InlineData("output.compresion = \"none\"", "r.toml:1:8", "did you mean compression?")]
    // Wrong kinds.
    [InlineData("title = 3", "r.toml:1:9", "title in the recipe cannot be 3; give text in quotes")]
    [InlineData("step = 3", "r.toml:1:8", "write [[step]]")]
    [InlineData("[step]\nfilter = \"a\"", "r.toml:1:2", "write [[step]]")]
    [InlineData("input = true", "r.toml:1:9", "write [input]")]
    [InlineData("[input]\nextensions = \"SCI\"", "r.toml:2:14", "give a list of texts")]
    [InlineData("[input]\nextensions = [\"SCI\", 2]", "r.toml:2:22", "extensions in [input] cannot be 2")]
    [InlineData("[input]\nsaturation = \"high\"", "r.toml:2:14", "saturation in [input] cannot be \"high\"")]
    [InlineData("[input]\nsaturation = inf", "r.toml:2:14", "give a finite number")]
    [InlineData("[input]\nmosaic = \"2x\"", "r.toml:2:1", "\"NxM\"")]
    [InlineData("[input]\nmosaic = \"0x2\"", "r.toml:2:1", "\"NxM\"")]
    [InlineData("[input]\nmosaic = \"17x2\"", "r.toml:2:1", "periods of 1 to 16")]
    [InlineData("[output]\nmask = \"yes\"", "r.toml:2:8", "give true | false")]
    [InlineData("[output]\nsamples = \"uint8\"", "r.toml:2:11", "\"auto\" | \"same\" | \"float32\" | \"float64\"")]
    [InlineData("[output]\ncompression = \"fast\"", "r.toml:2:15", "\"none\" | \"lossless\"")]
    [InlineData("[[step]]\nfilter = \"a\"\nwhen = 2020-01-01", "r.toml:3:8", "when in [[step]] cannot be a date")]
    [InlineData("[[step]]\nfilter = \"a\"\nlist = [1, \"b\"]", "r.toml:3:12", "give a list of numbers")]
    [InlineData("[[step]]\nfilter = \"a\"\nchannel = -1", "r.toml:3:11", "a channel's number from 0")]
    [InlineData("[[step]]\nfilter = \"a\"\nchannel = 1.5", "r.toml:3:11", "a channel's number from 0")]
    [InlineData("[[step]]\nthreshold = 5", "r.toml:2:1", "a step must name its filter")]
    // Noise tables that say too little, too much, or something impossible.
    [InlineData("[noise]\ngain = 1", "r.toml:2:1", "must say where the noise model comes from")]
    [InlineData("[noise]\nfrom = \"sky\"", "r.toml:2:8", "from in [noise] cannot be \"sky\"")]
    [InlineData("[noise]\nfrom = \"values\"\ngain = 0\nread_noise = 3\npedestal = 0", "r.toml:3:8", "gain in [noise] cannot be 0; give a number above 0")]
    [InlineData("[noise]\nfrom = \"values\"\ngain = 1\nread_noise = -3\npedestal = 0", "r.toml:4:14", "0 or more")]
    [InlineData("[noise]\nfrom = \"values\"\nread_noise = 3\npedestal = 0", "r.toml:2:1", "needs gain")]
    [InlineData("[noise]\nfrom = \"values\"\ngain = 1\npedestal = 0", "r.toml:2:1", "needs read_noise")]
    [InlineData("[noise]\nfrom = \"values\"\ngain = 1\nread_noise = 3", "r.toml:2:1", "a missing pedestal is not zero")]
    [InlineData("[noise]\nfrom = \"values\"\nsigma = 2\ngain = 1", "r.toml:4:1", "sigma stands for the whole model")]
    [InlineData("[noise]\nfrom = \"values\"\nsigma = 0", "r.toml:3:9", "a number above 0")]
    [InlineData("[noise]\nfrom = \"frame\"\ngain = 1", "r.toml:3:1", "measures a constant sigma")]
    [InlineData("[noise]\nfrom = \"header\"\nsigma = 1", "r.toml:3:1", "sigma does not belong here")]
    [InlineData("[noise]\nfrom = \"file\"\nfile = \"noise.toml\"", "r.toml:2:1", "cannot be used yet")]
    [InlineData("[[noise]]\nfrom = \"frame\"\n[[noise]]\nfrom = \"header\"", "r.toml:4:1", "a second noise table for all channels")]
    [InlineData("[[noise]]\nchannel = 1\nfrom = \"frame\"\n[[noise]]\nfrom = \"header\"\nchannel = \"1\"", "r.toml:6:1", "a second noise table for channel 1")]
    // Not TOML.
    [InlineData("title = \"x", "r.toml:1:10", "not valid TOML")]
    [InlineData("[input]\nmosaic = \n", "r.toml:2:10", "not valid TOML")]
    [InlineData("title = \"a\"\ntitle = \"b\"", "r.toml:2:1", "already defined")]
    [InlineData("[input]\n[output]\n[input]\n", "r.toml:3:1", "already defined")]
    [InlineData("[input]\nsaturation = 99999999999999999999", "r.toml:2:14", "not valid TOML")]
    public void Faults_are_named_with_their_place(string text, string place, string says)
    {
        RecipeException fault = Assert.Throws<RecipeException>(() => RecipeReader.Parse(text, "r.toml"));

        Assert.StartsWith(place + ": ", fault.Message, StringComparison.Ordinal);
        Assert.Contains(says, fault.Message, StringComparison.Ordinal);
        Assert.DoesNotContain('\n', fault.Message);
        Assert.Equal(78, fault.ExitCode);
    }

    [Fact]
    public void Files_that_are_no_recipe()
    {
        using TestSupport.TemporaryFolder folder = new();
        File.WriteAllBytes(folder.File("latin.toml"), [.. "title = \"caf"u8, 0xE9, .. "\""u8]);
        File.WriteAllBytes(folder.File("marked.toml"), [0xEF, 0xBB, 0xBF, .. "title = \"x\""u8]);
        using (FileStream large = File.Create(folder.File("large.toml")))
            large.SetLength((1 << 20) + 1);

        Assert.Contains("not UTF-8", Assert.Throws<RecipeException>(() => RecipeReader.Read(folder.File("latin.toml"))).Message, StringComparison.Ordinal);
        Assert.Contains("1 MiB", Assert.Throws<RecipeException>(() => RecipeReader.Read(folder.File("large.toml"))).Message, StringComparison.Ordinal);
        Assert.Contains("is a folder", Assert.Throws<RecipeException>(() => RecipeReader.Read(folder.Path)).Message, StringComparison.Ordinal);
        Assert.Equal(66, Assert.Throws<InputMissingException>(() => RecipeReader.Read(folder.File("none.toml"))).ExitCode);
        Assert.Equal("x", RecipeReader.Read(folder.File("marked.toml")).Title);
    }

    /// <summary>Distances of these pairs are the textbook examples of the edit distance (common knowledge, from memory; checked by hand).</summary>
    [Theory]
    [InlineData("kitten", "sitting", 3)]
    [InlineData("saturday", "sunday", 3)]
    [InlineData("", "abc", 3)]
    [InlineData("abc", "", 3)]
    [InlineData("gain", "gain", 0)]
    public void Edit_distance(string a, string b, int distance) => Assert.Equal(distance, NearestWord.Distance(a, b));
}
