using System.Security.Cryptography;
using Stacks.Abstractions;

namespace Stacks.TestSupport;

/// <summary>The shortest way from a reader to a writer: every frame decoded, encoded and written, no step between.</summary>
public static class PassThrough
{
    /// <summary>Writes a stack as it is and gives it its final name.</summary>
    /// <param name="source">The stack.</param>
    /// <param name="format">Format of the result.</param>
    /// <param name="target">Path of the result.</param>
    /// <param name="mask">Write a change mask: <paramref name="flag"/>, and the frame's number in its first sample.</param>
    /// <param name="flag">Flags of every sample.</param>
    /// <param name="change">Changes stored samples before they are encoded, and their type.</param>
    /// <param name="compress">Compress losslessly; short for <paramref name="compression"/>.</param>
    /// <param name="compression">How samples are compressed.</param>
    public static ProvenanceRecord Run(
        IStackReader source, IStackFormat format, string target, bool mask = false, SampleFlags flag = SampleFlags.None, TypeChange? change = null, bool compress = false,
        OutputCompression compression = OutputCompression.None)
    {
        WriteRequest request = new()
        {
            Source = source,
            Path = target,
            SampleTypeOf = frame => change?.Type ?? source.Layout(frame).SampleType,
            Mask = mask,
            Compression = compress ? OutputCompression.Lossless : compression,
            Created = Created,
        };
        List<LedgerRow> ledger = [];
        ProvenanceRecord provenance = Provenance(source);
        using (IStackWriter writer = format.Create(request))
        {
            ByteBuffer raw = new();
            EncodedFrame encoded = new();
            for (int frame = 0; frame < source.FrameCount; frame++)
            {
                byte[] stored = Stored(source, frame, raw);
                ledger.Add(Row(frame, stored));
                byte[] flags = new byte[source.Layout(frame).Length];
                flags.AsSpan().Fill((byte)flag);
                flags[0] = (byte)frame;
                writer.Encode(frame, change?.Convert(source.Layout(frame), stored) ?? stored, flags, encoded);
                writer.Write(frame, encoded);
            }

            writer.Complete(provenance, ledger);
            foreach (OutputFile file in writer.Files)
                File.Move(file.Partial, file.Final, overwrite: true);
        }

        return provenance;
    }

    /// <summary>The stored samples of a frame.</summary>
    public static byte[] Stored(IStackReader source, int frame, ByteBuffer? raw = null)
    {
        raw ??= new ByteBuffer();
        source.Read(frame, raw);
        byte[] stored = new byte[source.Layout(frame).StoredBytes];
        source.Decode(frame, raw.Written, stored);
        return stored;
    }

    /// <summary>The stamp of every result of the tests.</summary>
    public static DateTimeOffset Created { get; } = new(2001, 2, 3, 4, 5, 6, TimeSpan.Zero);

    private static LedgerRow Row(int frame, byte[] stored) => new()
    {
        Frame = frame,
        SourceDigest = SHA256.HashData(stored),
        ResultDigest = SHA256.HashData(stored),
        Level = 100.5 + frame,
        NoiseBefore = double.NaN,
        NoiseAfter = 0.25,
        ReplacedBright = 1 + frame,
        ReplacedDark = 2,
        KeptAsSource = 3,
        Saturated = 4,
        Missing = (1L << 40) + 5,
        FluxIn = 1e300,
        FluxRemoved = -0.1,
        FluxOut = 3,
        Flags = LedgerFlags.NoiseDisagrees | LedgerFlags.OutOfRange,
    };

    /// <summary>A record with something in every field.</summary>
    public static ProvenanceRecord Provenance(IStackReader source) => new()
    {
        Program = "Stacks",
        Version = "0.1.0",
        Created = Created,
        RecipeTitle = "Nothing is done",
        RecipeDigest = new string('a', 64),
        WorkDigest = new string('b', 64),
        SourceName = Path.GetFileName(source.Path),
        SourceDigest = new string('c', 64),
        Steps = [new ProvenanceStep("some-filter", "Some.Plugin", "1.2.3", new string('d', 64), null, [new ResolvedParameter("threshold", "5", "sigma"), new ResolvedParameter("window", "7", "px")])],
        Noise = ["variance 0.685 ADU x (v - 200 ADU) + 4.8 ADU^2, from the recipe"],
        Totals = new RunTotals(source.FrameCount, 1, 2, 3, 4, 5, 1e20, -0.5, 7),
        Remarks = ["Header gain and read noise no longer give the error of a pixel."],
    };
}

/// <summary>Another sample type for a result.</summary>
/// <param name="Type">The type.</param>
/// <param name="Convert">Stored samples of the source to stored samples of the type.</param>
public sealed record TypeChange(SampleType Type, Func<FrameLayout, byte[], byte[]> Convert);
