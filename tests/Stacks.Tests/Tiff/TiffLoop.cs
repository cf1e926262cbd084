using System.Security.Cryptography;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;

namespace Stacks.Tests.Tiff;

/// <summary>The smallest run: read, decode, encode, write, complete, rename.</summary>
internal static class TiffLoop
{
    public static readonly DateTimeOffset Created = new(2024, 2, 3, 4, 5, 6, TimeSpan.Zero);

    /// <summary>The stored samples of a frame.</summary>
    public static byte[] Samples(IStackReader reader, int frame)
    {
        ByteBuffer raw = new();
        reader.Read(frame, raw);
        byte[] stored = new byte[reader.Layout(frame).StoredBytes];
        reader.Decode(frame, raw.Written, stored);
        return stored;
    }

    /// <summary>Copies a stack, with the samples changed by <paramref name="change"/>.</summary>
    public static IReadOnlyList<string> Copy(
        IStackReader reader,
        string path,
        OutputCompression compression = OutputCompression.None,
        bool mask = false,
        bool carry = true,
        Func<int, SampleType>? typeOf = null,
        Func<int, byte[], byte[]>? change = null,
        Func<ProvenanceRecord, ProvenanceRecord>? provenance = null)
    {
        typeOf ??= f => reader.Layout(f).SampleType;
        using IStackWriter writer = new TiffFormat().Create(new WriteRequest
        {
            Source = reader,
            Path = path,
            SampleTypeOf = typeOf,
            Mask = mask,
            Compression = compression,
            Carry = carry,
            Created = Created,
        });
        List<LedgerRow> ledger = [];
        EncodedFrame encoded = new();
        for (int f = 0; f < reader.FrameCount; f++)
        {
            byte[] before = Samples(reader, f);
            byte[] after = change?.Invoke(f, before) ?? [.. before];
            byte[] flags = new byte[reader.Layout(f).Length];
            for (int i = 0; i < flags.Length; i++)
                flags[i] = (byte)((i + f) % 7 == 0 ? 8 : 0);
            ledger.Add(Row(f, SHA256.HashData(before), SHA256.HashData(after)));
            writer.Encode(f, after, flags, encoded);
            writer.Write(f, encoded);
        }

        ProvenanceRecord record = Record(ledger.Count);
        writer.Complete(provenance?.Invoke(record) ?? record, ledger);
        writer.Dispose();
        foreach (OutputFile file in writer.Files)
            File.Move(file.Partial, file.Final);
        return [.. writer.Files.Select(f => f.Final)];
    }

    public static LedgerRow Row(int frame, byte[] source, byte[] result) => new()
    {
        Frame = frame,
        SourceDigest = source,
        ResultDigest = result,
        Level = 100.25,
        NoiseBefore = 3.5,
        NoiseAfter = double.NaN,
        ReplacedBright = 7 + frame,
        ReplacedDark = 1,
        KeptAsSource = 2,
        Saturated = 3,
        Missing = 4,
        FluxIn = 1e9 / 3,
        FluxRemoved = 0.1,
        FluxOut = (1e9 / 3) - 0.1,
        Flags = LedgerFlags.NoiseDisagrees,
    };

    public static ProvenanceRecord Record(int frames) => new()
    {
        Program = "stacks",
        Version = "0.1.0",
        Created = Created,
        RecipeTitle = "A title with <, & and µ",
        RecipeDigest = new string('a', 64),
        WorkDigest = "0123456789abcdef0123456789abcdef0123456789abcdef0123456789abcdef",
        SourceName = "source.tif",
        SourceDigest = new string('c', 64),
        Steps =
        [
            new ProvenanceStep("adaptive-median", "Stacks.Filters.AdaptiveMedian", "0.1.0", new string('d', 64), null, [new("threshold", "5", "sigma"), new("largest_window", "7", "px")]),
            new ProvenanceStep("bilateral", "Stacks.Filters.Bilateral", "0.1.0", new string('e', 64), "DAPI", [new("spatial_sigma", "1.5", "px")]),
        ],
        Noise = ["all channels: gain 1.46 e-/ADU, read noise 3.2 e-, from the recipe"],
        Totals = new RunTotals(frames, 70, 10, 20, 30, 40, 1.5, 0.25, 1.25),
        Remarks = ["header gain no longer gives the error of a pixel"],
    };
}
