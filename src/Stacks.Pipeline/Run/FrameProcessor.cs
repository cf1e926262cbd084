using System.Globalization;
using System.Runtime.ExceptionServices;
using System.Runtime.InteropServices;
using System.Security.Cryptography;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// The way of one frame through a worker: decode, digest, flags, values, filter, result, account, encode.
/// Safe for concurrent use; all memory is the slot's.
/// </summary>
internal sealed class FrameProcessor(
    RunPlan plan, PreparedSteps steps, FrameMasks masks, NoiseModels noiseModels, IStackWriter writer, IRowBands bands, CancellationToken cancellation)
{
    /// <summary>Turns a slot's raw bytes into encoded ones, and accounts for what was done.</summary>
    public void Process(FrameSlot slot)
    {
        FrameLayout layout = plan.LayoutOf(slot.Frame);
        PreparedFrame prepared = steps.For(layout);
        FramePlanes frame = slot.Whole;
        StoredSamples source = StoredSamples.Of(layout.SampleType);

        // Decode.
        Span<byte> stored = slot.Stored.Resize(checked((int)layout.StoredBytes));
        plan.Reader.Decode(slot.Frame, slot.Raw.Written, stored);
        byte[] sourceDigest = SHA256.HashData(stored);

        // Flags: what is known of every sample before any filter.
        frame.Shape(layout.Width, layout.Height);
        Span<SampleFlags> flags = frame.Flags.Samples;
        masks.Mark(slot.Frame, layout, flags);
        plan.Reader.MarkQuality(slot.Frame, frame.Flags);
        source.Mark(stored, layout, flags);
        long missing = FlagScan.Count(flags, SampleFlags.Missing);
        long saturated = FlagScan.Count(flags, SampleFlags.Saturated);
        SampleSum fluxIn = source.Sum(stored, flags, layout.Width);

        // Values and their noise.
        frame.Start(layout.WorkType).Load(source, stored, layout.Transform);
        FrameNoise? noise = noiseModels.For(slot.Frame, layout, frame, slot.Scratch);

        // Filter: the frame, or its sub-lattices one after the other.
        if (layout.Lattice.IsSingle)
            Filter(slot, frame, prepared.Parts[0], noise?.Model);
        else
            FilterMosaic(slot, frame, prepared, noise?.Model);
        cancellation.ThrowIfCancellationRequested();

        // Result: the source's samples with the replaced ones patched, or new samples from the values.
        StoredSamples target = StoredSamples.Of(prepared.OutputType);
        bool sameType = prepared.OutputType == layout.SampleType;
        ValueTransform transform = sameType ? layout.Transform : ValueTransform.Identity;
        bool held;
        bool changed = prepared.IsRewritten || FlagScan.Any(flags, SampleFlags.Replaced);
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
        SampleSum fluxOut = changed ? target.Sum(result, flags, layout.Width) : fluxIn;
        LedgerRow row = new()
        {
            Frame = slot.Frame,
            SourceDigest = sourceDigest,
            ResultDigest = changed ? SHA256.HashData(result) : sourceDigest,
            Level = double.NaN,
            NoiseBefore = double.NaN,
            NoiseAfter = double.NaN,
            ReplacedBright = FlagScan.Count(flags, SampleFlags.ReplacedBright),
            ReplacedDark = FlagScan.Count(flags, SampleFlags.ReplacedDark),
            KeptAsSource = FlagScan.Count(flags, SampleFlags.KeptAsSource),
            Saturated = saturated,
            Missing = missing,
            FluxIn = fluxIn.Value(layout.Transform),
            FluxRemoved = sameType ? fluxIn.Less(fluxOut, transform) : fluxIn.Value(layout.Transform) - fluxOut.Value(transform),
            FluxOut = fluxOut.Value(transform),
            Flags = held ? LedgerFlags.OutOfRange : LedgerFlags.None,
        };
        slot.Account = new FrameAccount(row, prepared, noise);

        // Encode.
        writer.Encode(slot.Frame, result, MemoryMarshal.AsBytes(flags), slot.Encoded);
    }

    private void FilterMosaic(FrameSlot slot, FramePlanes frame, PreparedFrame prepared, NoiseModel? noise)
    {
        Lattice lattice = prepared.Layout.Lattice;
        WorkPlane source = frame.Current;
        foreach (PreparedPart part in prepared.Parts)
        {
            FramePlanes planes = slot.Part;
            planes.Split(frame, source, lattice, part.OffsetX, part.OffsetY);
            Filter(slot, planes, part, noise?.Sublattice(lattice, part.OffsetX, part.OffsetY));
            planes.Join(frame, lattice, part.OffsetX, part.OffsetY);
        }
    }

    private void Filter(FrameSlot slot, FramePlanes planes, PreparedPart part, NoiseModel? noise)
    {
        foreach (PreparedStep step in part.Steps)
        {
            cancellation.ThrowIfCancellationRequested();
            FrameContext context = new()
            {
                FrameIndex = slot.Frame,
                Noise = noise,
                HasMissing = FlagScan.Any(planes.Flags.Samples, SampleFlags.Missing),
                HasSaturated = FlagScan.Any(planes.Flags.Samples, SampleFlags.Saturated),
                Bands = bands,
                Scratch = slot.Scratch,
                Cancellation = cancellation,
            };
            planes.Convert(step.Type);
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

    private PluginException PluginFault(int frame, PreparedStep step, Exception fault)
    {
        string where = string.Create(
            CultureInfo.InvariantCulture, $"{plan.Reader.Path}, frame {frame}, step {step.Number} ({step.Planned.Section.Filter})");
        return new PluginException(
            where, $"the filter failed: {fault.Message.ReplaceLineEndings(" ")}", "report it to the author of the plugin; --verbose shows where", fault);
    }
}
