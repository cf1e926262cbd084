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
    private readonly List<string> files = [];
    private readonly List<int> firstFrame = [0];
    private readonly ReaderPool readers;

    /// <summary>Opens every file once, counts its frames and closes it. A file that belongs to the stack of an earlier one is passed over.</summary>
    /// <param name="name">Folder or pattern that named the files.</param>
    /// <param name="paths">One file or more, in order.</param>
    /// <param name="catalogue">The formats.</param>
    /// <param name="options">How each file is opened.</param>
    /// <exception cref="StacksException">A file is missing or cannot be read as a stack.</exception>
    public StackSeries(string name, IReadOnlyList<string> paths, PluginCatalogue catalogue, ReadOptions options)
    {
        Path = name;
        Format = FormatFinder.Of(paths[0], catalogue).Format;
        IStackReader Open(string path) => FormatFinder.Of(path, catalogue).Format.Open(path, options);
        readers = new ReaderPool(file => Open(files[file]), MostOpen);
        HashSet<string> covered = [];
        List<string> unlike = [], losses = [], others = [];
        IReadOnlyList<HeaderFact> facts = [];
        FrameLayout? first = null;
        foreach (string path in paths.Where(p => !covered.Contains(RealPath.Of(p))))
        {
            using IStackReader reader = Open(path);
            covered.UnionWith(reader.OtherFiles.Select(RealPath.Of));
            files.Add(path);
            others.AddRange([path, .. reader.OtherFiles]);
            firstFrame.Add(checked(firstFrame[^1] + reader.FrameCount));
            losses.AddRange(reader.Losses.Select(loss => $"{path}: {loss}"));
            FrameLayout layout = reader.Layout(0);
            if (first is null)
                (first, facts) = (layout, reader.Facts);
            if ((layout.Width, layout.Height, layout.SampleType) != (first.Width, first.Height, first.SampleType))
                unlike.Add($"{System.IO.Path.GetFileName(path)} ({layout.Width} x {layout.Height} {layout.SampleType.Name()})");
        }

        OtherFiles = [.. others.Skip(1)];
        Losses = losses;
        Unlike = unlike;
        string Last(string path) => System.IO.Path.GetFileName(path);
        Facts =
        [
            new HeaderFact("files", string.Create(CultureInfo.InvariantCulture, $"{files.Count}, from {Last(files[0])} to {Last(files[^1])}")),
            .. unlike.Count == 0 ? [] : new[] { new HeaderFact("unlike the first", string.Join("; ", unlike.Take(MostNamed)) + (unlike.Count > MostNamed ? $"; and {unlike.Count - MostNamed} more" : "")) },
            .. facts,
        ];
    }

    /// <inheritdoc/>
    public string Path { get; }

    /// <inheritdoc/>
    public IStackFormat Format { get; }

    /// <inheritdoc/>
    public IReadOnlyList<string> OtherFiles { get; }

    /// <inheritdoc/>
    public IReadOnlyList<string> Losses { get; }

    /// <inheritdoc/>
    public int FrameCount => firstFrame[^1];

    /// <inheritdoc/>
    public IReadOnlyList<StackPart> Parts => [];

    /// <inheritdoc/>
    public IReadOnlyList<HeaderFact> Facts { get; }

    /// <summary>The files whose first frame differs in shape or sample type from that of the first file.</summary>
    public IReadOnlyList<string> Unlike { get; }

    /// <inheritdoc/>
    public FrameLayout Layout(int frame)
    {
        using ReaderPool.Lease file = Lend(frame, out int own);
        return file.Reader.Layout(own);
    }

    /// <inheritdoc/>
    public HeaderNoise NoiseOf(int frame)
    {
        using ReaderPool.Lease file = Lend(frame, out int own);
        return file.Reader.NoiseOf(own);
    }

    /// <inheritdoc/>
    public IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation)
    {
        int sound = 0;
        for (int i = 0; i < files.Count; i++)
        {
            using ReaderPool.Lease file = readers.Lend(i);
            bool isSound = true;
            foreach (HealthFinding problem in file.Reader.CheckHealth(cancellation).Where(f => f.IsProblem))
            {
                isSound = false;
                yield return problem with { Text = $"{files[i]}: {problem.Text}" };
            }

            sound += isSound ? 1 : 0;
        }

        yield return new HealthFinding(false, string.Create(CultureInfo.InvariantCulture, $"{sound} of {files.Count} files without a fault"));
    }

    /// <inheritdoc/>
    public void Read(int frame, ByteBuffer raw)
    {
        using ReaderPool.Lease file = Lend(frame, out int own);
        file.Reader.Read(own, raw);
    }

    /// <inheritdoc/>
    public void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored)
    {
        using ReaderPool.Lease file = Lend(frame, out int own);
        file.Reader.Decode(own, raw, stored);
    }

    /// <inheritdoc/>
    public bool DecodesInPlace(int frame)
    {
        using ReaderPool.Lease file = Lend(frame, out int own);
        return file.Reader.DecodesInPlace(own);
    }

    /// <inheritdoc/>
    public long RawBytes(int frame)
    {
        using ReaderPool.Lease file = Lend(frame, out int own);
        return file.Reader.RawBytes(own);
    }

    /// <inheritdoc/>
    public bool MarkQuality(int frame, Plane<SampleFlags> flags)
    {
        using ReaderPool.Lease file = Lend(frame, out int own);
        return file.Reader.MarkQuality(own, flags);
    }

    /// <inheritdoc/>
    public void Dispose() => readers.Dispose();

    private ReaderPool.Lease Lend(int frame, out int own)
    {
        ArgumentOutOfRangeException.ThrowIfNegative(frame);
        ArgumentOutOfRangeException.ThrowIfGreaterThanOrEqual(frame, FrameCount);
        int at = firstFrame.BinarySearch(frame); // every file has a frame, so that no two begin with the same
        int file = at >= 0 ? at : ~at - 1;
        own = frame - firstFrame[file];
        return readers.Lend(file);
    }
}
