using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Searches and counts over flags.</summary>
internal static class FlagScan
{
    /// <summary>Index of the first sample from <paramref name="start"/> on that a selective step decided about; -1 when there is none.</summary>
    public static int NextDecision(ReadOnlySpan<SampleFlags> flags, int start)
    {
        // The decisions are the upper bits of the byte, so a byte with any of them is at least the lowest of them.
        int found = MemoryMarshal.AsBytes(flags[start..]).IndexOfAnyInRange((byte)SampleFlags.ReplacedBright, byte.MaxValue);
        return found < 0 ? -1 : start + found;
    }

    /// <summary>Counts of every flag, in one pass.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    public static FlagCounts CountAll(ReadOnlySpan<SampleFlags> flags)
    {
        FlagCounts counts = default;
        ReadOnlySpan<byte> bytes = MemoryMarshal.AsBytes(flags);
        int i = 0;
        for (; i <= bytes.Length - Vector<byte>.Count; i += Vector<byte>.Count)
        {
            Vector<byte> vector = new(bytes[i..]);
            if (vector == Vector<byte>.Zero)
                continue;
            foreach (ulong word in MemoryMarshal.Cast<byte, ulong>(bytes.Slice(i, Vector<byte>.Count)))
                counts = counts.Add(word);
        }

        for (; i < bytes.Length; i++)
            counts = counts.Add(bytes[i]);
        return counts;
    }
}

/// <summary>Samples that have a flag, for every flag.</summary>
internal readonly record struct FlagCounts(long Missing, long Saturated, long ReplacedBright, long ReplacedDark, long KeptAsSource)
{
    /// <summary>The counts with those of eight samples more.</summary>
    public FlagCounts Add(ulong flags) => new(
        Missing + Count(flags, SampleFlags.Missing),
        Saturated + Count(flags, SampleFlags.Saturated),
        ReplacedBright + Count(flags, SampleFlags.ReplacedBright),
        ReplacedDark + Count(flags, SampleFlags.ReplacedDark),
        KeptAsSource + Count(flags, SampleFlags.KeptAsSource));

    private static int Count(ulong flags, SampleFlags flag) => BitOperations.PopCount(flags & (0x0101010101010101UL * (byte)flag));
}
