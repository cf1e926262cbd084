namespace Stacks.Abstractions;

/// <summary>
/// A file format. Implementations are public, stateless, and have a public constructor without parameters; the
/// catalogue finds them in plugin assemblies.
/// </summary>
public interface IStackFormat
{
    /// <summary>Name in recipes: <c>fits</c>, <c>tiff</c>.</summary>
    string Id { get; }

    /// <summary>File name extension of written files, with the dot.</summary>
    string Extension { get; }

    /// <summary>Endings of file names that promise this format, with the dot, lower case; <see cref="Extension"/> is one of them.</summary>
    IReadOnlyList<string> Endings => [Extension];

    /// <summary>True when a file that starts with these bytes (up to 4096 of them) is of this format.</summary>
    bool Recognises(ReadOnlySpan<byte> start);

    /// <summary>Why samples of a type cannot be written; null when they can.</summary>
    string? CannotStore(SampleType type);

    /// <summary>Why results cannot be compressed in a way; null when they can.</summary>
    string? CannotCompress(OutputCompression compression) => null;

    /// <summary>Opens a file and reads its structure, not its samples.</summary>
    /// <exception cref="StackFormatException">Broken, hostile, truncated, or of a kind that is refused by name.</exception>
    IStackReader Open(string path, ReadOptions options);

    /// <summary>Creates the output's files under their partial names.</summary>
    /// <exception cref="OutputException">A file cannot be created.</exception>
    IStackWriter Create(WriteRequest request);
}

/// <summary>How a file is opened.</summary>
public sealed record ReadOptions
{
    /// <summary>Names of the extensions that hold science frames; null to decide by the file's own conventions.</summary>
    public IReadOnlyList<string>? Extensions { get; init; }

    /// <summary>True to open a truncated file, with its whole frames only and the loss named in Health.</summary>
    public bool AllowTruncated { get; init; }
}

/// <summary>One line about a part of a file that the user should see: an HDU, a group of pages.</summary>
/// <param name="Name">Name within the file.</param>
/// <param name="Shape">Shape and type, or a table's size.</param>
/// <param name="Role">Science, error plane and so on, <c>table</c>, <c>empty</c>.</param>
/// <param name="Fate">What a run does with it: <c>filtered</c>, <c>carried</c>, <c>not carried</c>.</param>
public sealed record StackPart(string Name, string Shape, string Role, string Fate);

/// <summary>A fact from the headers, for people.</summary>
/// <param name="Label">What it is.</param>
/// <param name="Value">The value with its unit.</param>
public sealed record HeaderFact(string Label, string Value);

/// <summary>What a file's headers say about its noise. Null where they are silent.</summary>
/// <param name="Gain">Electrons per ADU.</param>
/// <param name="ReadNoise">Electrons rms.</param>
/// <param name="Pedestal">Level without light, value units.</param>
/// <param name="Origin">The keywords read, for provenance and warnings: <c>EGAIN, RDNOISE, overscan of BIASSEC</c>.</param>
/// <param name="Doubt">A caution about the values (GAIN may be a camera setting); null when there is none.</param>
public sealed record HeaderNoise(double? Gain, double? ReadNoise, double? Pedestal, string Origin, string? Doubt);

/// <summary>A finding about a file's integrity.</summary>
/// <param name="IsProblem">False for good news (a checksum that agrees).</param>
/// <param name="Text">The finding, with its place.</param>
public sealed record HealthFinding(bool IsProblem, string Text);

/// <summary>
/// Science frames by index in O(1). Frame methods are safe for concurrent use; memory does not grow with frames beyond
/// an index of offsets.
/// </summary>
public interface IStackReader : IDisposable
{
    /// <summary>Path as given.</summary>
    string Path { get; }

    /// <summary>The format.</summary>
    IStackFormat Format { get; }

    /// <summary>Paths of the further files whose frames belong to this stack; empty when all stands in one.</summary>
    IReadOnlyList<string> OtherFiles => [];

    /// <summary>
    /// What is missing of a stack that was opened with <see cref="ReadOptions.AllowTruncated"/>, a sentence each with
    /// frames and place; empty when it is whole.
    /// </summary>
    IReadOnlyList<string> Losses => [];

    /// <summary>Science frames in the file.</summary>
    int FrameCount { get; }

    /// <summary>Layout of a science frame.</summary>
    FrameLayout Layout(int frame);

    /// <summary>All parts of the file, for <c>inspect</c>.</summary>
    IReadOnlyList<StackPart> Parts { get; }

    /// <summary>Header facts, for <c>inspect</c>.</summary>
    IReadOnlyList<HeaderFact> Facts { get; }

    /// <summary>What the headers say about a frame's noise. May read samples (an overscan strip).</summary>
    HeaderNoise NoiseOf(int frame);

    /// <summary>Checks integrity: checksums, truncation. May read the whole file.</summary>
    IEnumerable<HealthFinding> CheckHealth(CancellationToken cancellation);

    /// <summary>Reads a frame's bytes as they stand in the file; no decoding.</summary>
    /// <exception cref="StackIOException">The operating system failed.</exception>
    /// <exception cref="StackFormatException">The file has become shorter.</exception>
    void Read(int frame, ByteBuffer raw);

    /// <summary>Decodes what <see cref="Read"/> gave into stored samples, little-endian, row-major, without gaps.</summary>
    /// <param name="frame">The frame.</param>
    /// <param name="raw">Bytes from the file.</param>
    /// <param name="stored">Receives <see cref="FrameLayout.StoredBytes"/> bytes.</param>
    /// <exception cref="StackFormatException">The bytes are not what the headers promise.</exception>
    void Decode(int frame, ReadOnlySpan<byte> raw, Span<byte> stored);

    /// <summary>
    /// True when what <see cref="Read"/> gives is as long as the stored samples, and any part of it that holds whole samples
    /// may be decoded apart and where it stands: <see cref="Decode"/> then gets one span as raw and as stored.
    /// </summary>
    bool DecodesInPlace(int frame) => false;

    /// <summary>Most bytes that <see cref="Read"/> gives, for plans of memory; compressed ones are taken as large as their samples.</summary>
    long RawBytes(int frame) => Layout(frame).StoredBytes;

    /// <summary>Marks samples that the file's own quality mask calls bad.</summary>
    /// <param name="frame">The frame.</param>
    /// <param name="flags">A plane of the frame's shape; <see cref="SampleFlags.Missing"/> is added where the mask says so.</param>
    /// <returns>False when the frame has no quality mask.</returns>
    bool MarkQuality(int frame, Plane<SampleFlags> flags);
}

/// <summary>A file under its partial and its final name.</summary>
/// <param name="Partial">Where it is written.</param>
/// <param name="Final">Where it goes when it is complete.</param>
public sealed record OutputFile(string Partial, string Final);

/// <summary>What is to be written.</summary>
public sealed record WriteRequest
{
    /// <summary>The stack the frames come from. A writer of the same format carries its headers and other parts.</summary>
    public required IStackReader Source { get; init; }

    /// <summary>Final path of the stack; the partial one is this with <c>.partial</c> added.</summary>
    public required string Path { get; init; }

    /// <summary>
    /// Sample type of a result frame. Where it equals the source's, the stored samples keep the source's transform and
    /// BLANK; where it differs, stored samples are values.
    /// </summary>
    public required Func<int, SampleType> SampleTypeOf { get; init; }

    /// <summary>Write the change mask (an extension of the file or a companion).</summary>
    public bool Mask { get; init; }

    /// <summary>How samples are compressed.</summary>
    public OutputCompression Compression { get; init; }

    /// <summary>Write what the source holds beside its science frames (tables, error planes, thumbnails); else it is named as not carried.</summary>
    public bool Carry { get; init; } = true;

    /// <summary>Stamp written as the time of making.</summary>
    public required DateTimeOffset Created { get; init; }
}

/// <summary>The bytes of one result frame.</summary>
public sealed class EncodedFrame
{
    /// <summary>Samples as they stand in the file.</summary>
    public ByteBuffer Data { get; } = new();

    /// <summary>The change mask as it stands in its file; empty when none is written.</summary>
    public ByteBuffer Mask { get; } = new();
}

/// <summary>Writes a stack: frames in order, then headers, ledger and provenance.</summary>
public interface IStackWriter : IDisposable
{
    /// <summary>The stack first, then companions.</summary>
    IReadOnlyList<OutputFile> Files { get; }

    /// <summary>Turns stored samples and flags into the bytes of the file. Safe for concurrent use; allocates nothing after warm-up.</summary>
    /// <param name="frame">The frame.</param>
    /// <param name="stored">Stored samples of the result's type, little-endian, row-major; may be overwritten.</param>
    /// <param name="flags">The flags of every sample, bytes of <see cref="SampleFlags"/>.</param>
    /// <param name="encoded">Receives the bytes.</param>
    void Encode(int frame, Span<byte> stored, ReadOnlySpan<byte> flags, EncodedFrame encoded);

    /// <summary>Writes a frame. Called by one thread, frame 0 first, every frame once.</summary>
    /// <exception cref="StackIOException">The operating system failed; disk full and file too large are named.</exception>
    void Write(int frame, EncodedFrame encoded);

    /// <summary>Writes what comes after the frames and patches what stands before them; the files are then complete but not yet synced.</summary>
    /// <param name="provenance">Who did what to which data.</param>
    /// <param name="ledger">A row per frame, in order.</param>
    void Complete(ProvenanceRecord provenance, IReadOnlyList<LedgerRow> ledger);
}
