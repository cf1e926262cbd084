using Stacks.Abstractions;
using Stacks.Pipeline;
using Stacks.Tests.Engine;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Plans;

/// <summary>A format whose files begin with its id; their frames are those of <see cref="Layouts"/>.</summary>
internal sealed class ShelfFormat(string id, string extension, params string[] others) : IStackFormat
{
    public string Id => id;

    public string Extension => extension;

    public IReadOnlyList<string> Endings => [extension, .. others];

    public List<FrameLayout> Layouts { get; } = [new() { Width = 64, Height = 48, SampleType = SampleType.UInt16, QuantisationStep = 1 }];

    public Func<int, HeaderNoise> Header { get; set; } = _ => new HeaderNoise(null, null, null, "", null);

    public SampleType? Refused { get; set; }

    public int Opened { get; private set; }

    public int Closed { get; private set; }

    public bool Recognises(ReadOnlySpan<byte> start) => start.StartsWith(System.Text.Encoding.ASCII.GetBytes(id));

    public string? CannotStore(SampleType type) => type == Refused ? "it has no such samples" : null;

    public IStackReader Open(string path, ReadOptions options)
    {
        Opened++;
        return new ShelfReader(path, this);
    }

    public IStackWriter Create(WriteRequest request) => throw new NotSupportedException();

    private sealed class ShelfReader(string path, ShelfFormat format) : IStackReader
    {
        public string Path => path;

        public IStackFormat Format => format;

        public int FrameCount => format.Layouts.Count;

        public IReadOnlyList<StackPart> Parts => [];

        public IReadOnlyList<HeaderFact> Facts => [];

        public FrameLayout Layout(int frame) => format.Layouts[frame];

        public HeaderNoise NoiseOf(int frame) => format.Header(frame);

        public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation) => [];

        public void Read(int frame, ByteBuffer raw) => raw.Resize((int)format.Layouts[frame].StoredBytes).Clear();

        public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored) => raw.CopyTo(stored);

        public bool MarkQuality(int frame, Plane<SampleFlags> flags) => false;

        public void Dispose() => format.Closed++;
    }
}

/// <summary>A folder with files of two formats, a catalogue of them and of some filters, and plans made from recipe texts.</summary>
internal sealed class PlanBench : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public ShelfFormat Sky { get; } = new("sky", ".sky", ".sk");

    public ShelfFormat Cell { get; } = new("cell", ".cell");

    public List<IFilterPlugin> Filters { get; } = [];

    public Resources Resources { get; set; } = new(2, 1L << 32, "--memory");

    public bool Overwrite { get; set; }

    public PluginCatalogue Catalogue => new(
        [.. Filters.Select(f => new CatalogueFilter(f, new PluginOrigin("Fakes", "1.2", "fakes.dll", "f1")))],
        [new CatalogueFormat(Sky, new PluginOrigin("Sky", "1", "sky.dll", "f2")), new CatalogueFormat(Cell, new PluginOrigin("Cell", "1", "cell.dll", "f3"))]);

    public string File(string name) => folder.File(name);

    public string Out => folder.File("out");

    /// <summary>Makes a file that begins with some text.</summary>
    public string Put(string name, string content)
    {
        Directory.CreateDirectory(Path.GetDirectoryName(File(name))!);
        System.IO.File.WriteAllText(File(name), content);
        return File(name);
    }

    public Recipe Recipe(string text) => RecipeReader.Parse(text, File("r.toml"));

    public IReadOnlyList<NamedOutput> Name(string recipe, string target, params string[] inputs) =>
        OutputNaming.Name(inputs, target, Recipe(recipe), Catalogue);

    /// <summary>The plan for one sky file.</summary>
    public RunPlan Plan(string recipe)
    {
        string input = Put("in.sky", "sky");
        RunPlanner planner = new(Recipe(recipe), Catalogue, Resources, Overwrite);
        return planner.Plan(Assert.Single(Name(recipe, Out, input)));
    }

    public RecipeException Refused(string recipe) => Assert.Throws<RecipeException>(() => Plan(recipe));

    public void Dispose() => folder.Dispose();

    /// <summary>A smoothing filter that adds nothing.</summary>
    public static FakeFilter Smooth(string id) => new(id, FilterKind.Smoothing, (input, _, output, _) => input.CopyTo(output));

    /// <summary>A selective filter that decides nothing.</summary>
    public static FakeFilter Select(string id) => new(id, FilterKind.Selective, (_, _, _, _) => { });
}
