using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// Many files as one stack: the frames of the first, then those of the next, and so on. A few files are open at a time,
/// however many there are; one that is asked for again is opened again. Frames may differ in shape from file to file; files
/// that are unlike the first are named among the facts.
/// </summary>
public sealed class StackSeries : IStackReader
{
    private const int MostOpen = 8;
    private const int MostNamed = 5;
    private readonly IReadOnlyList<string> files;
    private readonly PluginCatalogue catalogue;
    private readonly ReadOptions options;
    private readonly int[] firstFrame;
    private readonly List<OpenFile> open = [];
    private readonly Lock gate = new();

    /// <summary>Opens every file once, counts its frames and closes it.</summary>
    /// <param name="name">Folder or pattern that named the files.</param>
    /// <param name="files">One file or more, in order.</param>
    /// <param name="catalogue">The formats.</param>
    /// <param name="options">How each file is opened.</param>
    /// <exception cref="StacksException">A file is missing or cannot be read as a stack.</exception>
    public StackSeries(string name, IReadOnlyList<string> files, PluginCatalogue catalogue, ReadOptions options)
    {
        Path = name;
        Format = FormatFinder.Of(files[0], catalogue).Format;
        this.files = files;
        this.catalogue = catalogue;
        this.options = options;
        firstFrame = new int[files.Count + 1];
        List<string> unlike = [];
        FrameLayout? first = null;
        for (int i = 0; i < files.Count; i++)
        {
            using IStackReader reader = Open(files[i]);
            firstFrame[i + 1] = checked(firstFrame[i] + reader.FrameCount);
            FrameLayout layout = reader.Layout(0);
            first ??= layout;
            if ((layout.Width, layout.Height, layout.SampleType) != (first.Width, first.Height, first.SampleType))
                unlike.Add($"{System.IO.Path.GetFileName(files[i])} ({layout.Width} x {layout.Height} {layout.SampleType.Name()})");
            if (i == 0)
                Facts = reader.Facts;
        }

        Unlike = unlike;
        Facts =
        [
            new HeaderFact("files", string.Create(CultureInfo.InvariantCulture, $"{files.Count}, from {System.IO.Path.GetFileName(files[0])} to {System.IO.Path.GetFileName(files[^1])}")),
            .. unlike.Count == 0 ? [] : new[] { new HeaderFact("unlike the first", string.Join("; ", unlike.Take(MostNamed)) + (unlike.Count > MostNamed ? $"; and {unlike.Count - MostNamed} more" : "")) },
            .. Facts!,
        ];
    }

    /// <inheritdoc/>
    public string Path { get; }

    /// <inheritdoc/>
    public IStackFormat Format { get; }

    /// <inheritdoc/>
    public IReadOnlyList<string> OtherFiles => [.. files.Skip(1)];

    /// <inheritdoc/>
    public IReadOnlyList<string> Losses => [.. Enumerable.Range(0, files.Count).SelectMany(i => With(i, reader => reader.Losses.Select(loss => $"{files[i]}: {loss}").ToArray()))];

    /// <inheritdoc/>
    public int FrameCount => firstFrame[^1];

    /// <inheritdoc/>
    public IReadOnlyList<StackPart> Parts => [];

    /// <inheritdoc/>
    public IReadOnlyList<HeaderFact> Facts { get; }

    /// <summary>The files whose first frame differs in shape or sample type from that of the first file.</summary>
    public IReadOnlyList<string> Unlike { get; }

    /// <inheritdoc/>
    public FrameLayout Layout(int frame) => At(frame, (reader, own) => reader.Layout(own));

    /// <inheritdoc/>
    public HeaderNoise NoiseOf(int frame) => At(frame, (reader, own) => reader.NoiseOf(own));

    /// <inheritdoc/>
    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation)
    {
        int sound = 0;
        for (int i = 0; i < files.Count; i++)
        {
            HealthFinding[] problems = With(i, reader => reader.CheckHealth(cancellation).Where(f => f.IsProblem).ToArray());
            sound += problems.Length == 0 ? 1 : 0;
            foreach (HealthFinding problem in problems)
                yield return problem with { Text = $"{files[i]}: {problem.Text}" };
        }

        yield return new HealthFinding(false, string.Create(CultureInfo.InvariantCulture, $"{sound} of {files.Count} files without a fault"));
    }

    /// <inheritdoc/>
    public void Read(int frame, ByteBuffer raw) => At(frame, (reader, own) =>
    {
        reader.Read(own, raw);
        return 0;
    });

    /// <inheritdoc/>
    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        int file = FileOf(frame);
        OpenFile lent = Lend(file);
        try
        {
            lent.Reader.Decode(frame - firstFrame[file], raw, stored);
        }
        finally
        {
            Return(lent);
        }
    }

    /// <inheritdoc/>
    public bool MarkQuality(int frame, Plane<SampleFlags> flags) => At(frame, (reader, own) => reader.MarkQuality(own, flags));

    /// <inheritdoc/>
    public void Dispose()
    {
        foreach (OpenFile file in open)
            file.Reader.Dispose();
    }

    private T At<T>(int frame, Func<IStackReader, int, T> ask)
    {
        int file = FileOf(frame);
        return With(file, reader => ask(reader, frame - firstFrame[file]));
    }

    private T With<T>(int file, Func<IStackReader, T> ask)
    {
        OpenFile lent = Lend(file);
        try
        {
            return ask(lent.Reader);
        }
        finally
        {
            Return(lent);
        }
    }

    private int FileOf(int frame)
    {
        ArgumentOutOfRangeException.ThrowIfNegative(frame);
        ArgumentOutOfRangeException.ThrowIfGreaterThanOrEqual(frame, FrameCount);
        int at = Array.BinarySearch(firstFrame, frame); // every file has a frame, so that no two begin with the same
        return at >= 0 ? at : ~at - 1;
    }

    private OpenFile Lend(int file)
    {
        lock (gate)
        {
            OpenFile? there = open.Find(o => o.File == file);
            if (there is not null)
                open.Remove(there);
            else
                there = new OpenFile(file, Open(files[file]));
            open.Add(there); // the last used stands last
            there.Users++;
            return there;
        }
    }

    private void Return(OpenFile lent)
    {
        lock (gate)
        {
            lent.Users--;
            while (open.Count > MostOpen && open.Find(o => o.Users == 0) is { } oldest)
            {
                open.Remove(oldest);
                oldest.Reader.Dispose();
            }
        }
    }

    private IStackReader Open(string file) => FormatFinder.Of(file, catalogue).Format.Open(file, options);

    private sealed class OpenFile(int file, IStackReader reader)
    {
        public int File { get; } = file;

        public IStackReader Reader { get; } = reader;

        public int Users { get; set; }
    }
}
