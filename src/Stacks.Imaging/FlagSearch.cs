using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>Searches over flags, many at once.</summary>
public static class FlagSearch
{
    /// <summary>True when any sample has one of the wanted flags.</summary>
    public static bool Any(ReadOnlySpan<SampleFlags> flags, SampleFlags wanted)
    {
        ReadOnlySpan<byte> bytes = MemoryMarshal.AsBytes(flags);
        Vector512<byte> all = Vector512<byte>.Zero;
        int i = 0;
        for (; i <= bytes.Length - Vector512<byte>.Count; i += Vector512<byte>.Count)
            all |= Vector512.Create(bytes[i..]);
        byte rest = 0;
        for (; i < bytes.Length; i++)
            rest |= bytes[i];
        return (rest & (byte)wanted) != 0 || (all & Vector512.Create((byte)wanted)) != Vector512<byte>.Zero;
    }

    /// <summary>Writes 1 where a sample has one of the wanted flags, 0 elsewhere.</summary>
    public static void Mark(ReadOnlySpan<SampleFlags> flags, SampleFlags wanted, Span<byte> marks)
    {
        ReadOnlySpan<byte> bytes = MemoryMarshal.AsBytes(flags);
        Vector512<byte> mask = Vector512.Create((byte)wanted);
        int i = 0;
        for (; i <= bytes.Length - Vector512<byte>.Count; i += Vector512<byte>.Count)
            Vector512.Min(Vector512.Create(bytes[i..]) & mask, Vector512<byte>.One).CopyTo(marks[i..]);
        for (; i < bytes.Length; i++)
            marks[i] = (bytes[i] & (byte)wanted) != 0 ? (byte)1 : (byte)0;
    }
}
