using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Looks a stack over without changing anything.</summary>
public static class StackInspector
{
    /// <summary>Most frames that are decoded; of longer stacks, this many at even distances, the first and last among them.</summary>
    public const int MostFrames = 16;

    /// <summary>Opens, decodes and checks a stack: a file, or all files of a folder or a pattern as one. A truncated one is opened as far as it goes.</summary>
    /// <exception cref="StacksException">There is no such file, or it cannot be read as a stack at all.</exception>
    public static StackInspection Inspect(InputSet input, PluginCatalogue catalogue, CancellationToken cancellation)
    {
        ReadOptions options = new() { AllowTruncated = true };
        using IStackReader reader = input.IsSeries
            ? new StackSeries(input.Name, input.Files, catalogue, options)
            : FormatFinder.Of(input.Name, catalogue).Format.Open(input.Name, options);
        List<HealthFinding> health = [.. reader.CheckHealth(cancellation)];
        List<FrameFigures> figures = [];
        FrameSlot slot = new();
        foreach (int frame in EvenlySpaced(reader.FrameCount))
        {
            cancellation.ThrowIfCancellationRequested();
            try
            {
                figures.Add(Measure(reader, frame, slot));
            }
            catch (StackFormatException broken)
            {
                health.Add(new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"frame {frame}: {broken.Message}")));
            }
        }

        return new StackInspection
        {
            Path = input.Name,
            Format = reader.Format.Id,
            FileBytes = input.Files.Union(reader.OtherFiles).Sum(file => new FileInfo(file).Length),
            FrameCount = reader.FrameCount,
            Layouts = [.. Enumerable.Range(0, reader.FrameCount)
                .CountBy(f => reader.Layout(f) with { Z = null, Time = null, Extension = null }).Select(g => (g.Key, g.Value))],
            Parts = reader.Parts,
            Facts = reader.Facts,
            Noise = reader.FrameCount > 0 ? reader.NoiseOf(0) : null,
            Figures = figures,
            Health = health,
        };
    }

    /// <summary>All indices below a count, or <see cref="MostFrames"/> of them: round(i (count - 1) / (MostFrames - 1)).</summary>
    internal static IEnumerable<int> EvenlySpaced(int count) => count <= MostFrames
        ? Enumerable.Range(0, count)
        : Enumerable.Range(0, MostFrames).Select(i => (int)(((2L * i * (count - 1)) + MostFrames - 1) / (2 * (MostFrames - 1))));

    private static FrameFigures Measure(IStackReader reader, int frame, FrameSlot slot)
    {
        FrameLayout layout = reader.Layout(frame);
        reader.Read(frame, slot.Raw);
        Span<byte> stored = slot.Stored.Resize(checked((int)layout.StoredBytes));
        reader.Decode(frame, slot.Raw.Written, stored);

        FramePlanes planes = slot.Whole;
        planes.Shape(layout.Width, layout.Height);
        Span<SampleFlags> flags = planes.Flags.Samples;
        reader.MarkQuality(frame, planes.Flags);
        StoredSamples samples = StoredSamples.Of(layout.SampleType);
        samples.Mark(stored, layout, flags);

        WorkPlane values = planes.Start(layout.WorkType);
        values.Load(samples, stored, layout.Transform, 0, (int)layout.Length);
        slot.Scratch.Reset();
        (double minimum, double maximum) = values.Extremes(flags);
        FlagCounts counts = FlagScan.CountAll(flags);
        return new FrameFigures(
            frame,
            layout,
            minimum,
            values.Median(flags, slot.Scratch),
            maximum,
            values.MeasureNoise(planes.Flags, layout.Lattice, layout.QuantisationStep, null, slot.Scratch).Sigma,
            counts.Missing,
            counts.Saturated);
    }
}
