using System.Globalization;
using Stacks.Abstractions;
using Stacks.Noise;

namespace Stacks.Pipeline;

/// <summary>What a run's frames say about the noise: a line per channel and origin, and the warnings.</summary>
internal sealed class NoiseAccount
{
    private readonly List<Line> lines = [];
    private readonly List<string> doubts = [];
    private int firstDisagreement;
    private double firstRatio;
    private int disagreements;
    private int firstUnmeasurable;
    private int unmeasurable;
    private int leftAlone;

    /// <summary>Adds a frame.</summary>
    public void Add(FrameAccount frame)
    {
        LedgerFlags flags = frame.Row.Flags;
        if (flags.HasFlag(LedgerFlags.NoiseDisagrees) && disagreements++ == 0)
            (firstDisagreement, firstRatio) = (frame.Row.Frame, frame.NoiseRatio);
        if (frame.Noise is not { } noise)
            return;
        if (flags.HasFlag(LedgerFlags.NoiseNotMeasurable) && unmeasurable++ == 0)
            firstUnmeasurable = frame.Row.Frame;
        if (noise.Model is null && frame.Prepared.NeedsNoise)
            leftAlone++;
        if (noise.Doubt is { } doubt && !doubts.Contains(doubt))
            doubts.Add(doubt);
        FrameLayout layout = frame.Prepared.Layout;
        string? channel = layout.ChannelName ?? layout.Channel?.ToString(CultureInfo.InvariantCulture);
        Line? line = lines.Find(l => l.Channel == channel && l.Origin == noise.Origin);
        if (line is null)
            lines.Add(line = new Line(channel, noise.Origin));
        line.Add(noise, frame.Row.NoiseBefore);
    }

    /// <summary>A line per channel and origin.</summary>
    public IReadOnlyList<string> Lines() => [.. lines.Select(l => l.ToString())];

    /// <summary>Sentences for the user.</summary>
    public IEnumerable<string> Warnings(int frames)
    {
        foreach (string doubt in doubts)
            yield return doubt;
        if (disagreements > 0)
            yield return ModelCheck.Warning(firstDisagreement, firstRatio, disagreements, frames);
        if (unmeasurable > 0)
        {
            string effect = leftAlone > 0 ? "; steps that need a noise model left such frames as they were" : "";
            yield return string.Create(
                CultureInfo.InvariantCulture,
                $"frame {firstUnmeasurable}: its noise cannot be measured, it has too few valid samples or none that vary (so in {unmeasurable} of {frames} frames){effect}");
        }
    }

    private sealed class Line(string? channel, string origin)
    {
        private readonly HashSet<string> models = [];
        private string first = "no frame with measurable noise";
        private bool isMeasured;
        private double least = double.PositiveInfinity;
        private double most = double.NegativeInfinity;

        public string? Channel => channel;

        public string Origin => origin;

        public void Add(FrameNoise noise, double sigma)
        {
            if (noise.Model is null)
                return;
            isMeasured = noise.IsMeasured;
            (least, most) = (Math.Min(least, sigma), Math.Max(most, sigma));
            string model = isMeasured ? "" : noise.Model.Describe();
            if (models.Add(model) && models.Count == 1)
                first = model;
        }

        public override string ToString()
        {
            string model = isMeasured ? string.Create(CultureInfo.InvariantCulture, $"sigma {least:G6} to {most:G6} ADU")
                : models.Count > 1 ? string.Create(CultureInfo.InvariantCulture, $"{first}, and {models.Count - 1} more that differ")
                : first;
            return $"{(channel is null ? "" : $"channel {channel}, ")}{origin}: {model}";
        }
    }
}
