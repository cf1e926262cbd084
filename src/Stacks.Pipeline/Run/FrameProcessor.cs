using System.Globalization;
using System.Runtime.ExceptionServices;
using System.Runtime.InteropServices;
using System.Security.Cryptography;
using Stacks.Abstractions;
using Stacks.Imaging;
using Stacks.Noise;

namespace Stacks.Pipeline;

/// <summary>
/// The way of one frame through a worker: decode, flags, values and noise, filter, result, account, encode.
/// Safe for concurrent use; all memory is the slot's.
/// </summary>
internal sealed class FrameProcessor(
    RunPlan plan, PreparedSteps steps, FrameMasks masks, NoiseModels noiseModels, IStackWriter writer, IRowBands bands, CancellationToken cancellation)
{
    private const int StripBytes = 1 << 17; // with its flags and values well inside a core's second cache

    /// <summary>Turns a slot's raw bytes into encoded ones, and accounts for what was done.</summary>
    public void Process(FrameSlot slot)
    {
        FrameLayout layout = plan.LayoutOf(slot.Frame);
        PreparedFrame prepared = steps.For(layout);
        FramePlanes frame = slot.Whole;
        StoredSamples source = StoredSamples.Of(layout.SampleType);

        // What is known of every sample before any is looked at.
        frame.Shape(layout.Width, layout.Height);
        Span<SampleFlags> flags = frame.Flags.Samples;
        masks.Mark(slot.Frame, layout, flags);
        plan.Reader.MarkQuality(slot.Frame, frame.Flags);

        // Decode, digest, flags, flux and values, a strip of rows after the other while it is in cache.
        bool inPlace = plan.Reader.DecodesInPlace(slot.Frame);
        Span<byte> stored = inPlace ? slot.Raw.Written : slot.Stored.Resize(checked((int)layout.StoredBytes));
        if (!inPlace)
            plan.Reader.Decode(slot.Frame, slot.Raw.Written, stored);
        frame.Start(layout.WorkType);
        SampleSum fluxIn = default;
        int size = layout.SampleType.Size(), most = Math.Max(1, StripBytes / (layout.Width * size)) * layout.Width;
        for (int first = 0; first < flags.Length; first += most)
        {
            int count = Math.Min(most, flags.Length - first);
            Span<byte> strip = stored.Slice(first * size, count * size);
            if (inPlace)
                plan.Reader.Decode(slot.Frame, strip, strip);
            slot.Digest.AppendData(strip);
            source.Mark(strip, layout, flags.Slice(first, count));
            fluxIn = source.Sum(fluxIn, strip, flags.Slice(first, count), layout.Width);
            frame.Current.Load(source, strip, layout.Transform, first, count);
        }

        byte[] sourceDigest = slot.Digest.GetHashAndReset();
        FlagCounts found = FlagScan.CountAll(flags);

        // Level and noise.
        double level = frame.Current.Median(found.Missing > 0 ? flags : [], slot.Scratch);
        FrameNoise? noise = noiseModels.For(slot.Frame, layout);
        NoiseMeasurement before = frame.Current.MeasureNoise(
            frame.Flags, layout.Lattice, layout.QuantisationStep, noise?.Model, slot.Scratch);
        slot.Scratch.Reset();
        if (noise is { IsMeasured: true })
            noise = noise with { Model = NoiseModels.Measured(before.Sigma) };
        if (noise is null && prepared.NeedsNoise)
            throw NoNoise(slot.Frame, layout, prepared);

        // Filter: the frame, or its sub-lattices one after the other.
        if (layout.Lattice.IsSingle)
            Filter(slot, frame, prepared.Parts[0], noise?.Model);
        else
            FilterMosaic(slot, frame, prepared, noise?.Model);

        // Result: the source's samples with the replaced ones patched, or new samples from the values.
        StoredSamples target = StoredSamples.Of(prepared.OutputType);
        bool sameType = prepared.OutputType == layout.SampleType;
        ValueTransform transform = sameType ? layout.Transform : ValueTransform.Identity;
        FlagCounts decided = FlagScan.CountAll(flags);
        bool changed = prepared.IsRewritten || decided.ReplacedBright + decided.ReplacedDark > 0;
        bool held;
        Span<byte> result = stored;
        if (!prepared.IsRewritten)
        {
            held = frame.Current.Patch(target, flags, transform, result);
        }
        else
        {
            result = slot.Result.Resize(checked((int)(layout.Length * prepared.OutputType.Size())));
            held = frame.Current.Store(target, transform, result);
            if (sameType)
                target.Keep(stored, flags, SampleFlags.Missing | SampleFlags.Saturated, SampleFlags.Replaced, result);
            else
                target.Void(flags, result);
        }

        // Account.
        SampleSum fluxOut = changed ? target.Sum(default, result, flags, layout.Width) : fluxIn;
        double step = prepared.IsRewritten && frame.Current.Type >= WorkType.Float32 ? 0 : layout.QuantisationStep;
        NoiseMeasurement after = changed
            ? frame.Current.MeasureNoise(frame.Flags, layout.Lattice, step, null, slot.Scratch)
            : before;
        slot.Scratch.Reset();
        LedgerRow row = new()
        {
            Frame = slot.Frame,
            SourceDigest = sourceDigest,
            ResultDigest = changed ? SHA256.HashData(result) : sourceDigest,
            Level = level,
            NoiseBefore = before.Sigma,
            NoiseAfter = after.Sigma,
            ReplacedBright = decided.ReplacedBright,
            ReplacedDark = decided.ReplacedDark,
            KeptAsSource = decided.KeptAsSource,
            Saturated = found.Saturated,
            Missing = found.Missing,
            FluxIn = fluxIn.Value(layout.Transform),
            FluxRemoved = sameType ? fluxIn.Less(fluxOut, transform) : fluxIn.Value(layout.Transform) - fluxOut.Value(transform),
            FluxOut = fluxOut.Value(transform),
            Flags = (ModelCheck.Disagrees(before.Ratio) ? LedgerFlags.NoiseDisagrees : LedgerFlags.None)
                | (double.IsNaN(before.Sigma) || noise is { Model: null } ? LedgerFlags.NoiseNotMeasurable : LedgerFlags.None)
                | (held ? LedgerFlags.OutOfRange : LedgerFlags.None),
        };
        slot.Account = new FrameAccount(row, prepared, noise, before.Ratio, slot.Figures);

        // Encode. The writer may overwrite the samples: nothing may read them after this.
        writer.Encode(slot.Frame, result, MemoryMarshal.AsBytes(flags), slot.Encoded);
    }

    private void FilterMosaic(FrameSlot slot, FramePlanes frame, PreparedFrame prepared, NoiseModel? noise)
    {
        Lattice lattice = prepared.Layout.Lattice;
        WorkPlane source = frame.Current;
        foreach (PreparedPart part in prepared.Parts)
        {
            slot.Part.Split(frame, source, lattice, part.OffsetX, part.OffsetY);
            Filter(slot, slot.Part, part, noise?.Sublattice(lattice, part.OffsetX, part.OffsetY));
            slot.Part.Join(frame, lattice, part.OffsetX, part.OffsetY);
        }
    }

    /// <summary>Runs the steps; those that need a noise model leave a frame without measurable noise as it is.</summary>
    private void Filter(FrameSlot slot, FramePlanes planes, PreparedPart part, NoiseModel? noise)
    {
        foreach (PreparedStep step in part.Steps)
        {
            cancellation.ThrowIfCancellationRequested();
            planes.Convert(step.Type);
            if (step.NeedsNoise && noise is null)
                continue;
            FrameContext context = new()
            {
                FrameIndex = slot.Frame,
                Noise = noise,
                HasMissing = FlagSearch.Any(planes.Flags.Samples, SampleFlags.Missing),
                HasSaturated = FlagSearch.Any(planes.Flags.Samples, SampleFlags.Saturated),
                Bands = bands,
                Scratch = slot.Scratch,
                Report = (name, value) => (slot.Figures ??= []).Add(new StepFigure(step.Number, name, value)),
                Cancellation = cancellation,
            };
            try
            {
                planes.Current.Apply(step.Step, step.Kind, planes.Flags, context);
            }
            catch (Exception fault) when (!cancellation.IsCancellationRequested)
            {
                Exception first = fault is AggregateException { InnerExceptions: [Exception inner, ..] } ? inner : fault;
                if (first is StacksException)
                    ExceptionDispatchInfo.Throw(first);
                throw PluginFault(slot.Frame, step, first);
            }

            planes.MoveDecisionsToHistory();
            slot.Scratch.Reset();
        }

        planes.MergeHistory();
    }

    private PluginException PluginFault(int frame, PreparedStep step, Exception fault) => new(
        string.Create(CultureInfo.InvariantCulture, $"{plan.Reader.Path}, frame {frame}, step {step.Number} ({step.Planned.Section.Filter})"),
        $"the filter failed: {fault.Message.ReplaceLineEndings(" ")}",
        "report it to the author of the plugin; --verbose shows where",
        fault);

    private static RecipeException NoNoise(int frame, FrameLayout layout, PreparedFrame prepared)
    {
        StepSection section = prepared.Parts[0].Steps.First(s => s.NeedsNoise).Planned.Section;
        return new RecipeException(
            section.Place.ToString(),
            string.Create(CultureInfo.InvariantCulture, $"{section.Filter} needs a noise model, and none is given for frame {frame} (channel {layout.Channel ?? 0})"),
            "add a [noise] table; from = \"frame\" measures it");
    }
}
