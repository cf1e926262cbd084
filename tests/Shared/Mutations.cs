using System.Buffers.Binary;
using Stacks.Abstractions;
using Xunit;

namespace Stacks.TestSupport;

/// <summary>Seeded damage to a file's bytes; the same seed gives the same bytes on any machine (System.Random with a seed is fixed).</summary>
public static class Mutations
{
    /// <summary>Numbers at which arithmetic on sizes goes wrong: ends of the integer types and their neighbours.</summary>
    private static readonly ulong[] Edges =
    [
        0, 1, 2, 3, 0x7F, 0x80, 0xFF, 0x100, 0x7FFF, 0x8000, 0xFFFF, 0x10000, 0x7FFFFFFF, 0x80000000, 0xFFFFFFF0, 0xFFFFFFFF, 0x100000000,
        0x7FFFFFFFFFFFFFFF, 0x8000000000000000, 0xFFFFFFFFFFFFFFF0, 0xFFFFFFFFFFFFFFFF,
    ];

    /// <summary>A copy of a file with one to four changes, each of a kind drawn from the seed.</summary>
    /// <param name="whole">The file.</param>
    /// <param name="seed">Number of the case.</param>
    /// <param name="structure">How many bytes of the file are structure, which is where half of all changes go; 0 for any place.</param>
    public static byte[] Of(byte[] whole, int seed, int structure = 0)
    {
        Random random = new(seed);
        List<byte> bytes = [.. whole];
        for (int changes = random.Next(1, 5); changes > 0 && bytes.Count > 8; changes--)
        {
            int end = structure > 8 && structure < bytes.Count && random.Next(2) == 0 ? structure : bytes.Count;
            int at = random.Next(end - 8);
            switch (random.Next(8))
            {
                case 0:
                    bytes[at] ^= (byte)(1 << random.Next(8));
                    break;
                case 1:
                    bytes[at] = (byte)random.Next(256);
                    break;
                case 2 or 3 or 4:
                    Put(bytes, at, Edges[random.Next(Edges.Length)], 1 << random.Next(1, 4), random.Next(2) == 0);
                    break;
                case 5:
                    // A piece of the file over another place.
                    int length = random.Next(1, Math.Min(64, bytes.Count - at));
                    List<byte> piece = bytes.GetRange(random.Next(bytes.Count - length), length);
                    for (int i = 0; i < length; i++)
                        bytes[at + i] = piece[i];
                    break;
                case 6:
                    bytes.RemoveRange(at, random.Next(1, Math.Min(64, bytes.Count - at)));
                    break;
                default:
                    bytes.RemoveRange(at, bytes.Count - at);
                    break;
            }
        }

        return [.. bytes];
    }

    private static void Put(List<byte> bytes, int at, ulong value, int size, bool bigEndian)
    {
        Span<byte> all = stackalloc byte[8];
        if (bigEndian)
            BinaryPrimitives.WriteUInt64BigEndian(all, value);
        else
            BinaryPrimitives.WriteUInt64LittleEndian(all, value);
        ReadOnlySpan<byte> some = bigEndian ? all[^size..] : all[..size];
        for (int i = 0; i < size; i++)
            bytes[at + i] = some[i];
    }
}

/// <summary>Runs what hostile input is given to, within the bounds that hold for any input.</summary>
public static class Bounded
{
    /// <summary>Bytes of managed memory that a case may allocate altogether.</summary>
    public const long Memory = 256L << 20;

    /// <summary>A case that takes as long has not ended: a safety net, not a measurement.</summary>
    public static readonly TimeSpan Time = TimeSpan.FromSeconds(5);

    /// <summary>Runs a case: it ends well, or with a typed error of one line that names the file.</summary>
    /// <param name="name">Name of the case, for failures.</param>
    /// <param name="file">Name of the file that an error must contain.</param>
    /// <param name="work">What is done with the file.</param>
    /// <returns>The error; null when there was none.</returns>
    public static StacksException? Run(string name, string file, Action work)
    {
        StacksException? refusal = null;
        Exception? fault = null;
        long allocated = 0;
        Thread thread = new(() =>
        {
            long before = GC.GetAllocatedBytesForCurrentThread();
            try
            {
                work();
            }
            catch (StacksException error)
            {
                refusal = error;
            }
            catch (Exception error)
            {
                fault = error;
            }

            allocated = GC.GetAllocatedBytesForCurrentThread() - before;
        })
        { IsBackground = true };
        thread.Start();
        Assert.True(thread.Join(Time), $"{name}: not done after {Time}");
        Assert.True(fault is null, $"{name}: {fault}");
        Assert.True(allocated <= Memory, $"{name}: {allocated} bytes allocated");
        if (refusal is not null)
        {
            Assert.True(refusal.Message.Contains(file, StringComparison.Ordinal), $"{name}: {refusal.Message}");
            Assert.True(!refusal.Message.Contains('\n'), $"{name}: {refusal.Message}");
        }

        return refusal;
    }
}
