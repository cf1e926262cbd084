using System.Numerics;
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

    /// <summary>Samples that have a flag.</summary>
    public static long Count(ReadOnlySpan<SampleFlags> flags, SampleFlags flag)
    {
        ReadOnlySpan<ulong> words = MemoryMarshal.Cast<SampleFlags, ulong>(flags);
        ulong mask = 0x0101010101010101UL * (byte)flag;
        long count = 0;
        foreach (ulong word in words)
            count += BitOperations.PopCount(word & mask);
        for (int i = words.Length * sizeof(ulong); i < flags.Length; i++)
            count += (flags[i] & flag) != 0 ? 1 : 0;
        return count;
    }

    /// <summary>True when any sample has a flag.</summary>
    public static bool Any(ReadOnlySpan<SampleFlags> flags, SampleFlags flag)
    {
        ReadOnlySpan<ulong> words = MemoryMarshal.Cast<SampleFlags, ulong>(flags);
        ulong mask = 0x0101010101010101UL * (byte)flag;
        foreach (ulong word in words)
        {
            if ((word & mask) != 0)
                return true;
        }

        for (int i = words.Length * sizeof(ulong); i < flags.Length; i++)
        {
            if ((flags[i] & flag) != 0)
                return true;
        }

        return false;
    }
}
