using System.Numerics;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;

namespace Stacks.Filters.AdaptiveMedian;

/// <summary>Samples of 16 and 32 bits as single-precision numbers, which hold them exactly.</summary>
internal static class Singles
{
    /// <summary>Converts samples.</summary>
    public static void From<T>(ReadOnlySpan<T> samples, Span<float> into)
        where T : unmanaged, INumber<T>
    {
        if (typeof(T) == typeof(float))
        {
            MemoryMarshal.Cast<T, float>(samples).CopyTo(into);
            return;
        }

        int i = 0;
        if (typeof(T) == typeof(ushort))
        {
            ReadOnlySpan<ushort> values = MemoryMarshal.Cast<T, ushort>(samples);
            for (; i <= values.Length - Vector512<float>.Count; i += Vector512<float>.Count)
            {
                (Vector256<uint> low, Vector256<uint> high) = Vector256.Widen(Vector256.Create(values[i..]));
                Vector512.ConvertToSingle(Vector512.Create(low, high).AsInt32()).CopyTo(into[i..]);
            }
        }
        else if (typeof(T) == typeof(short))
        {
            ReadOnlySpan<short> values = MemoryMarshal.Cast<T, short>(samples);
            for (; i <= values.Length - Vector512<float>.Count; i += Vector512<float>.Count)
            {
                (Vector256<int> low, Vector256<int> high) = Vector256.Widen(Vector256.Create(values[i..]));
                Vector512.ConvertToSingle(Vector512.Create(low, high)).CopyTo(into[i..]);
            }
        }

        for (; i < samples.Length; i++)
            into[i] = float.CreateTruncating(samples[i]);
    }
}
