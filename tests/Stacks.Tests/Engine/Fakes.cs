using System.Buffers.Binary;
using System.Numerics;
using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>A stack in memory, with a file of its samples on disk so that it has a digest.</summary>
internal sealed class MemoryReader : IStackReader
{
    private readonly List<(FrameLayout Layout, byte[] Stored)> frames = [];

    public MemoryReader(string path) => Path = path;

    public string Path { get; }

    public IStackFormat Format => new MemoryFormat();

    public int FrameCount => frames.Count;

    public IReadOnlyList<StackPart> Parts => [];

    public IReadOnlyList<HeaderFact> Facts => [];

    public Func<int, HeaderNoise> Header { get; set; } = _ => new HeaderNoise(null, null, null, "", null);

    public Action<int, Plane<SampleFlags>>? Quality { get; set; }

    public Action<int>? OnDecode { get; set; }

    public Action<int>? OnRead { get; set; }

    public MemoryReader Add<T>(FrameLayout layout, params T[] samples)
        where T : unmanaged
    {
        Assert.Equal(layout.StoredBytes, samples.Length * Marshal.SizeOf<T>());
        frames.Add((layout, MemoryMarshal.AsBytes<T>(samples).ToArray()));
        using FileStream file = new(Path, frames.Count == 1 ? FileMode.Create : FileMode.Append);
        file.Write(frames[^1].Stored);
        return this;
    }

    public byte[] Stored(int frame) => frames[frame].Stored;

    public FrameLayout Layout(int frame) => frames[frame].Layout;

    public HeaderNoise NoiseOf(int frame) => Header(frame);

    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation) => [];

    public void Read(int frame, ByteBuffer raw)
    {
        OnRead?.Invoke(frame);
        Stored(frame).CopyTo(raw.Resize(Stored(frame).Length));
    }

    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        OnDecode?.Invoke(frame);
        raw.CopyTo(stored);
    }

    public bool MarkQuality(int frame, Plane<SampleFlags> flags)
    {
        Quality?.Invoke(frame, flags);
        return Quality is not null;
    }

    public void Dispose()
    {
    }
}

/// <summary>Writes frame count, then stored samples, one frame after the other; a mask file with the flags beside it.</summary>
internal sealed class MemoryFormat : IStackFormat
{
    public string Id => "memory";

    public string Extension => ".mem";

    public Action? OnComplete { get; set; }

    public MemoryWriter? Last { get; private set; }

    public bool Recognises(ReadOnlySpan<byte> start) => false;

    public string? CannotStore(SampleType type) => null;

    public IStackReader Open(string path, ReadOptions options) => throw new NotSupportedException();

    public IStackWriter Create(WriteRequest request) => Last = new MemoryWriter(request) { OnComplete = OnComplete };
}

internal sealed class MemoryWriter : IStackWriter
{
    private readonly FileStream stack;
    private readonly FileStream? mask;

    public MemoryWriter(WriteRequest request)
    {
        OutputFile file = new(request.Path + ".partial", request.Path);
        stack = File.Create(file.Partial);
        Files = [file];
        if (request.Mask)
        {
            OutputFile companion = new(request.Path + ".mask.partial", request.Path + ".mask");
            mask = File.Create(companion.Partial);
            Files = [file, companion];
        }
    }

    public Action? OnComplete { get; set; }

    public IReadOnlyList<OutputFile> Files { get; }

    public List<byte[]> Frames { get; } = [];

    public List<byte[]> Flags { get; } = [];

    public IReadOnlyList<LedgerRow> Ledger { get; private set; } = [];

    public ProvenanceRecord? Provenance { get; private set; }

    public void Encode(int frame, Span<byte> stored, ReadOnlySpan<byte> flags, EncodedFrame encoded)
    {
        stored.CopyTo(encoded.Data.Resize(stored.Length));
        flags.CopyTo(encoded.Mask.Resize(flags.Length));
    }

    public void Write(int frame, EncodedFrame encoded)
    {
        Assert.Equal(Frames.Count, frame);
        Frames.Add(encoded.Data.Written.ToArray());
        Flags.Add(encoded.Mask.Written.ToArray());
        stack.Write(encoded.Data.Written);
        mask?.Write(encoded.Mask.Written);
    }

    public void Complete(ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
    {
        OnComplete?.Invoke();
        (Provenance, Ledger) = (provenance, ledger);
        Span<byte> count = stackalloc byte[4];
        BinaryPrimitives.WriteInt32LittleEndian(count, ledger.Count);
        stack.Write(count);
        stack.Flush();
        mask?.Flush();
    }

    public void Dispose()
    {
        stack.Dispose();
        mask?.Dispose();
    }
}

/// <summary>A filter made of a function over (input, flags, output, context) for every work type, in double precision.</summary>
internal sealed class FakeFilter(string id, FilterKind kind, FakeFilter.Body body) : IFilterPlugin
{
    public delegate void Body(ReadOnlySpan<double> input, Plane<SampleFlags> flags, Span<double> output, FrameContext context);

    public string Id => id;

    public string Summary => id;

    public string Source => "none";

    public FilterKind Kind => kind;

    public Equivariance Equivariance => Equivariance.Affine;

    public bool NeedsNoise { get; init; }

    public IReadOnlyList<ParameterSpec> Parameters { get; init; } = [];

    public IReadOnlyList<WorkType> WorkTypes { get; init; } = [WorkType.UInt16, WorkType.Int16, WorkType.Float32, WorkType.Float64];

    public List<(FrameLayout Layout, WorkType Type)> Prepared { get; } = [];

    public IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values)
    {
        lock (Prepared)
            Prepared.Add((layout, workType));
        return workType switch
        {
            WorkType.UInt16 => new Step<ushort>(layout, body),
            WorkType.Int16 => new Step<short>(layout, body),
            WorkType.Float32 => new Step<float>(layout, body),
            _ => new Step<double>(layout, body),
        };
    }

    /// <summary>Replaces samples above a limit with a value, and marks them bright.</summary>
    public static FakeFilter Cap(double limit, double value) => new("cap", FilterKind.Selective, (input, flags, output, _) =>
    {
        for (int i = 0; i < input.Length; i++)
        {
            SampleFlags known = flags.Samples[i];
            if ((known & (SampleFlags.Missing | SampleFlags.Saturated)) == 0 && input[i] > limit)
            {
                flags.Samples[i] |= SampleFlags.ReplacedBright;
                output[i] = value;
            }
        }
    });

    /// <summary>v -> factor v + offset, missing and saturated samples as they are.</summary>
    public static FakeFilter Scale(double factor, double offset) => new("scale", FilterKind.Smoothing, (input, flags, output, _) =>
    {
        for (int i = 0; i < input.Length; i++)
            output[i] = (flags.Samples[i] & (SampleFlags.Missing | SampleFlags.Saturated)) != 0 ? input[i] : (factor * input[i]) + offset;
    });

    private sealed class Step<T>(FrameLayout layout, Body body) : IFilterStep<T>
        where T : unmanaged, INumber<T>
    {
        public int? Reach => null;

        public long ScratchBytes => 0;

        public IReadOnlyList<ResolvedParameter> Resolved => [new("width", layout.Width.ToString(System.Globalization.CultureInfo.InvariantCulture), "px")];

        public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
        {
            double[] from = [.. input.Samples.ToArray().Select(double.CreateTruncating)];
            double[] to = new double[from.Length];
            Array.Fill(to, -12345);
            body(from, flags, to, context);
            for (int i = 0; i < to.Length; i++)
                output.Samples[i] = T.CreateSaturating(to[i]);
        }
    }
}

/// <summary>A folder, a source in it, and plans over that source.</summary>
internal sealed class Bench : IDisposable
{
    private readonly TestSupport.TemporaryFolder folder = new();

    public Bench() => Source = new MemoryReader(folder.File("in.mem"));

    public MemoryReader Source { get; }

    public MemoryFormat Format { get; } = new();

    public string Output => folder.File("out.mem");

    public string Folder => folder.Path;

    public string[] FilesThere => [.. Directory.GetFiles(folder.Path).Select(f => Path.GetFileName(f)).Order(StringComparer.Ordinal)];

    public RunPlan Plan(params FakeFilter[] filters) => new()
    {
        Reader = Source,
        Recipe = new Recipe { Path = folder.File("recipe.toml"), Title = "Test" },
        RecipeDigest = string.Join('-', filters.Select(f => f.Id)) + "-digest",
        Steps = [.. filters.Select(f => Step(f))],
        OutputPath = Output,
        OutputFormat = Format,
        FormatOrigins = [new PluginOrigin("Memory", "1.0", "memory.dll", "f0")],
        WriteMask = true,
        Workers = 2,
        FramesInFlight = 3,
        Overwrite = false,
    };

    public static PlannedStep Step(IFilterPlugin filter, string? channel = null, params (string Name, ParameterValue Value)[] given)
    {
        Dictionary<string, ParameterValue> values = given.ToDictionary(g => g.Name, g => g.Value);
        return new PlannedStep(
            new CatalogueFilter(filter, new PluginOrigin("Fakes", "1.2", "fakes.dll", "f1")),
            new ParameterValues(filter.Parameters, values),
            new StepSection
            {
                Place = new RecipePlace("recipe.toml", 7, 1),
                Filter = filter.Id,
                Channel = channel,
                Parameters = values,
                Places = new Dictionary<string, RecipePlace>(),
            });
    }

    /// <summary>Runs a plan and gives what its writer was given.</summary>
    public MemoryWriter Run(RunPlan plan)
    {
        RunResult result = StackRun.Execute(plan, null, CancellationToken.None);
        Assert.Equal(RunOutcome.Made, result.Outcome);
        return Format.Last!;
    }

    public void Dispose() => folder.Dispose();
}
