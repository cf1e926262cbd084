using System.Diagnostics;
using System.Globalization;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>Speed of a run and the time it still takes.</summary>
internal sealed class Rate(RunPlan plan)
{
    private readonly long start = Stopwatch.GetTimestamp();
    private readonly double frameBytes = plan.Kinds.Sum(k => (double)k.Count * k.Layout.StoredBytes) / plan.Reader.FrameCount;

    /// <summary>Time since the start.</summary>
    public TimeSpan Elapsed => Stopwatch.GetElapsedTime(start);

    /// <summary><c>12.3 frames/s, 103 MB/s</c>; bytes are the decoded input's.</summary>
    public string Speed(int framesDone)
    {
        double perSecond = framesDone / Math.Max(Elapsed.TotalSeconds, 1e-3);
        return string.Create(CultureInfo.InvariantCulture, $"{perSecond:G3} frames/s, {perSecond * frameBytes / 1e6:G3} MB/s");
    }

    /// <summary>Time left at the mean speed so far.</summary>
    public TimeSpan Left(RunProgress progress) =>
        progress.FramesDone == 0 ? TimeSpan.Zero : Elapsed * ((double)(progress.FrameCount - progress.FramesDone) / progress.FramesDone);

    /// <summary><c>1:02:03</c> or <c>2:03</c>.</summary>
    public static string Clock(TimeSpan time) => time.TotalHours >= 1
        ? string.Create(CultureInfo.InvariantCulture, $"{(int)time.TotalHours}:{time.Minutes:00}:{time.Seconds:00}")
        : string.Create(CultureInfo.InvariantCulture, $"{time.Minutes}:{time.Seconds:00}");
}
