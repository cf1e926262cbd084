using System.Buffers.Binary;
using System.Numerics;
using System.Runtime.InteropServices;
using System.Security.Cryptography;
using Microsoft.Win32.SafeHandles;
using Stacks.Pipeline;

namespace Stacks.Benchmarks;

/// <summary>
/// The least that a run of an uncompressed 16-bit FITS cube must do, and nothing else: a copy by two threads, strip by strip in
/// cache, with the digests and the fsync of a run. Each thread takes the next frame that is left.
/// </summary>
/// <param name="source">The cube: one header, then frames of the benchmarks' scene.</param>
/// <param name="target">The copy.</param>
/// <param name="frames">Frames.</param>
/// <param name="digests">Which digests are taken.</param>
internal sealed class BareCopy(string source, string target, int frames, BareDigests digests)
{
    private const int Threads = 2;
    private const int FrameBytes = 2 * Scene.Side * Scene.Side;
    private const int StripBytes = 1 << 17;
    private readonly byte[][] strips = [.. Enumerable.Range(0, Threads).Select(_ => new byte[StripBytes])];
    private readonly byte[][] rests = [.. Enumerable.Range(0, Threads).Select(_ => new byte[StripBytes])];
    private readonly uint[] sums = new uint[2 * Threads];
    private readonly byte[][] taken = new byte[(2 * frames) + 2][];
    private int next;

    /// <summary>Copies.</summary>
    public void Run()
    {
        next = 0;
        using SafeFileHandle input = File.OpenHandle(source), output = File.OpenHandle(target, FileMode.Create, FileAccess.ReadWrite);
        long header = RandomAccess.GetLength(input) % FrameBytes;
        Task first = Task.Factory.StartNew(() => Frames(0, input, output, header), TaskCreationOptions.LongRunning);
        Task second = Task.Factory.StartNew(
            () =>
            {
                if (digests.HasFlag(BareDigests.Files))
                    taken[^1] = Digest(input, 1);
                Frames(1, input, output, header);
            },
            TaskCreationOptions.LongRunning);
        Task.WaitAll(first, second);
        RandomAccess.Write(output, new byte[header], 0);

        Task sync = Task.Factory.StartNew(() => Durable.Sync(target), TaskCreationOptions.LongRunning);
        if (digests.HasFlag(BareDigests.Files))
            taken[^2] = Digest(output, 0);
        sync.Wait();
    }

    private void Frames(int thread, SafeFileHandle input, SafeFileHandle output, long header)
    {
        Span<byte> strip = strips[thread];
        Span<ushort> samples = MemoryMarshal.Cast<byte, ushort>(strip);
        using IncrementalHash before = IncrementalHash.CreateHash(HashAlgorithmName.SHA256), after = IncrementalHash.CreateHash(HashAlgorithmName.SHA256);
        for (int frame = Interlocked.Increment(ref next) - 1; frame < frames; frame = Interlocked.Increment(ref next) - 1)
        {
            for (int done = 0; done < FrameBytes; done += StripBytes)
            {
                long offset = header + ((long)frame * FrameBytes) + done;
                RandomAccess.Read(input, strip, offset);
                sums[2 * thread] += Sum(strip);
                Swap(samples);
                before.AppendData(strip);
                if (digests.HasFlag(BareDigests.ResultFrames))
                    after.AppendData(strip);
                Swap(samples);
                sums[(2 * thread) + 1] += Sum(strip);
                RandomAccess.Write(output, strip, offset);
            }

            taken[2 * frame] = before.GetHashAndReset();
            taken[(2 * frame) + 1] = after.GetHashAndReset();
        }
    }

    /// <summary>SHA-256 of a whole file.</summary>
    private byte[] Digest(SafeFileHandle file, int thread)
    {
        using IncrementalHash hash = IncrementalHash.CreateHash(HashAlgorithmName.SHA256);
        Span<byte> strip = rests[thread];
        long offset = 0;
        for (int read = RandomAccess.Read(file, strip, 0); read > 0; read = RandomAccess.Read(file, strip, offset))
        {
            hash.AppendData(strip[..read]);
            offset += read;
        }

        return hash.GetHashAndReset();
    }

    /// <summary>Big-endian to little-endian and the sign's convention, or back.</summary>
    private static void Swap(Span<ushort> samples)
    {
        BinaryPrimitives.ReverseEndianness(samples, samples);
        foreach (ref Vector<ushort> vector in MemoryMarshal.Cast<ushort, Vector<ushort>>(samples))
            vector ^= new Vector<ushort>(0x8000);
    }

    /// <summary>The 32-bit words of a strip added up, for as much work as a DATASUM is.</summary>
    private static uint Sum(ReadOnlySpan<byte> bytes)
    {
        Vector<ulong> sum = Vector<ulong>.Zero;
        foreach (Vector<ulong> pair in MemoryMarshal.Cast<byte, Vector<ulong>>(bytes))
            sum += (pair & new Vector<ulong>(uint.MaxValue)) + (pair >>> 32);
        ulong total = Vector.Sum(sum);
        return (uint)total + (uint)(total >> 32);
    }
}

/// <summary>Digests of a <see cref="BareCopy"/> besides those of the source's frames and the two sums of FITS.</summary>
[Flags]
internal enum BareDigests
{
    /// <summary>SHA-256 of each source frame, DATASUM of source and result.</summary>
    SourceFrames = 0,

    /// <summary>SHA-256 of each result frame too, as where a step changes them.</summary>
    ResultFrames = 1,

    /// <summary>SHA-256 of both files too, as the provenance names them.</summary>
    Files = 2,
}
