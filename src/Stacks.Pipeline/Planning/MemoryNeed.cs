using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// Resident memory of a run: what the program needs by itself, and for each frame in flight raw bytes, stored samples in
/// and out, the planes that steps work in, flags, encoded bytes and scratch.
/// </summary>
/// <param name="BaseBytes">Runtime, plugins and pools.</param>
/// <param name="FrameBytes">Bytes of one frame in flight, for the largest kind of frame.</param>
public sealed record MemoryNeed(long BaseBytes, long FrameBytes)
{
    private const long Runtime = 96L << 20; // measured: an idle host with its plugins, and the collector's slack

    /// <summary>The need of a stack's frames.</summary>
    public static MemoryNeed Of(IReadOnlyList<FrameKind> kinds, bool mask) =>
        new(Runtime, kinds.Max(k => FrameMemory.BytesOf(k, mask)));

    /// <summary>Bytes for a number of frames in flight.</summary>
    public long For(int framesInFlight) => BaseBytes + (FrameBytes * framesInFlight);

    /// <summary>Frames in flight that fit a limit, at most as many as wanted.</summary>
    /// <exception cref="UsageException">Not even one fits.</exception>
    public int Fit(int wanted, Resources resources)
    {
        long fitting = (resources.MemoryBytes - BaseBytes) / FrameBytes;
        if (fitting < 1)
        {
            throw new UsageException(resources.MemoryOrigin, $"{Megabytes(resources.MemoryBytes)} do not hold one frame in flight, which needs {Megabytes(For(1))}",
                $"give --memory {Megabytes(For(1))} or more");
        }

        return (int)Math.Min(wanted, fitting);
    }

    private static string Megabytes(long bytes) => $"{(bytes + (1 << 20) - 1) >> 20}MiB";
}
