using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Pipeline;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>Tests that count what the whole process allocates run alone.</summary>
[CollectionDefinition(Name, DisableParallelization = true)]
public class AloneCollection
{
    public const string Name = "alone";
}

[Collection(AloneCollection.Name)]
public class MemoryTests
{
    public static TheoryData<Lattice> Lattices => new(Lattice.Single, new Lattice(2, 2));

    [Theory]
    [MemberData(nameof(Lattices))]
    public void Memory_is_used_again_from_frame_to_frame(Lattice lattice)
    {
        // Frames of 64 kB through every kind of buffer; after warm-up a frame may cost objects, not planes.
        _ = Allocated(lattice, 181, 4);
        long few = Allocated(lattice, 181, 10), many = Allocated(lattice, 181, 60);
        Assert.InRange((many - few) / 50, -4096, 16384); // other threads of the test process allocate too
    }

    [Theory]
    [MemberData(nameof(Lattices))]
    public void The_need_that_a_plan_states_is_what_a_frame_takes(Lattice lattice)
    {
        const int Side = 1000;
        using Bench bench = WithFrames(lattice, Side, 1);
        double stated = FrameMemory.BytesOf(Assert.Single(FrameKinds.Of(Plan(bench))), mask: true);
        _ = Allocated(lattice, Side, 1);
        Assert.InRange(Allocated(lattice, Side, 1), 0.8 * stated, 1.02 * stated);
    }

    /// <summary>A whole run from file to file. A frame has 512 kB of samples; objects for its account may cost some kB.</summary>
    [Theory]
    [InlineData("")]
    [InlineData("[noise]\nfrom = \"frame\"\n[[step]]\nfilter = \"adaptive-median\"\nlargest_window = 7\npsf_fwhm = 0\n")]
    public void A_run_allocates_nothing_for_a_frame_after_warm_up(string recipe)
    {
        const int Side = 512, Frames = 44, From = 20, To = 40;
        using TemporaryFolder folder = new();
        Random random = new(9);
        byte[][] stored = [.. Enumerable.Range(0, 4).Select(_ => new byte[2 * Side * Side])];
        foreach (byte[] frame in stored)
        {
            Span<ushort> samples = MemoryMarshal.Cast<byte, ushort>(frame.AsSpan());
            for (int i = 0; i < samples.Length; i++)
                samples[i] = (ushort)(random.Next(1000) == 0 ? 5000 : 1000 + random.Next(40) + random.Next(40));
        }

        FrameLayout layout = new() { Width = Side, Height = Side, SampleType = SampleType.UInt16, QuantisationStep = 1 };
        PassThrough.Run(new ForeignStack([.. Enumerable.Range(0, Frames).Select(f => (layout, stored[f % 4]))]), new FitsFormat(), folder.File("in.fits"));
        Probe probe = new(From, To);
        HostRun.Of(recipe, folder.File("in.fits"), folder.File("result.fits"), workers: 2, progress: probe);
        Assert.InRange(probe.Bytes / (To - From), 0, 16384);
    }

    /// <summary>Bytes that the process allocates from one frame written to another.</summary>
    private sealed class Probe(int from, int to) : IProgress<RunProgress>
    {
        public long Bytes { get; private set; }

        public void Report(RunProgress value)
        {
            if (value.FramesDone == from)
                Bytes = -GC.GetTotalAllocatedBytes(precise: true);
            else if (value.FramesDone == to)
                Bytes += GC.GetTotalAllocatedBytes(precise: true);
        }
    }

    private static Bench WithFrames(Lattice lattice, int side, int frames)
    {
        Bench bench = new();
        FrameLayout layout = new() { Width = side, Height = side, SampleType = SampleType.UInt16, Lattice = lattice };
        for (int f = 0; f < frames; f++)
            bench.Source.Add(layout, new ushort[side * side]);
        return bench;
    }

    private static RunPlan Plan(Bench bench) => bench.Plan() with
    {
        Steps = [Bench.Step(new QuietFilter())],
    };

    private static long Allocated(Lattice lattice, int side, int frames)
    {
        using Bench bench = WithFrames(lattice, side, frames);
        RunPlan plan = Plan(bench);
        NoCopyWriter writer = new();
        using FrameGraph graph = new(bench.Source, writer, 1, 2);
        FrameProcessor processor = new(
            plan, new PreparedSteps(plan), new FrameMasks(plan, default), new NoiseModels(plan), writer, Imaging.SerialBands.Instance, default);
        long before = GC.GetTotalAllocatedBytes(precise: true);
        graph.Run(processor.Process, _ => { }, default);
        Assert.InRange(graph.SlotsMade, 1, 2);
        return GC.GetTotalAllocatedBytes(precise: true) - before;
    }

    /// <summary>Smooths by half and half with a rented plane, and allocates nothing.</summary>
    private sealed class QuietFilter : IFilterPlugin, IFilterStep<float>
    {
        private long samples;

        public string Id => "quiet";

        public string Summary => "";

        public string Source => "";

        public FilterKind Kind => FilterKind.Smoothing;

        public Equivariance Equivariance => Equivariance.Affine;

        public bool NeedsNoise => false;

        public IReadOnlyList<ParameterSpec> Parameters => [];

        public IReadOnlyList<WorkType> WorkTypes => [WorkType.Float32];

        public int? Reach => 0;

        public long ScratchBytes => samples * sizeof(float);

        public IReadOnlyList<ResolvedParameter> Resolved => [];

        public IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values)
        {
            samples = layout.Length;
            return this;
        }

        public void Apply(Plane<float> input, Plane<SampleFlags> flags, Plane<float> output, FrameContext context)
        {
            Plane<float> half = context.Scratch.Rent<float>(input.Width, input.Height);
            for (int i = 0; i < input.Length; i++)
            {
                half.Samples[i] = input.Samples[i] / 2;
                output.Samples[i] = 2 * half.Samples[i];
            }
        }
    }

    private sealed class NoCopyWriter : IStackWriter
    {
        public IReadOnlyList<OutputFile> Files => [];

        public void Encode(int frame, Span<byte> stored, ReadOnlySpan<byte> flags, EncodedFrame encoded)
        {
            stored.CopyTo(encoded.Data.Resize(stored.Length));
            flags.CopyTo(encoded.Mask.Resize(flags.Length));
        }

        public void Write(int frame, EncodedFrame encoded)
        {
        }

        public void Complete(ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger)
        {
        }

        public void Dispose()
        {
        }
    }
}
