using System.Numerics;
using System.Runtime.CompilerServices;

namespace Stacks.Imaging;

/// <summary>Unsigned integers in the order of samples, which are neither NaN nor negative zeros.</summary>
public static class SampleKeys
{
    /// <summary>The key of a sample: as many bits as the sample has.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static ulong Of<T>(T sample)
        where T : unmanaged, INumber<T>
    {
        if (typeof(T) == typeof(ushort))
            return Unsafe.BitCast<T, ushort>(sample);
        if (typeof(T) == typeof(short))
            return (ushort)(Unsafe.BitCast<T, short>(sample) ^ short.MinValue);
        if (typeof(T) == typeof(float))
        {
            int bits = Unsafe.BitCast<T, int>(sample);
            return (uint)(bits ^ ((bits >> 31) | int.MinValue));
        }

        long wide = Unsafe.BitCast<T, long>(sample);
        return (ulong)(wide ^ ((wide >> 63) | long.MinValue));
    }

    /// <summary>The sample of a key.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static T ToSample<T>(ulong key)
        where T : unmanaged, INumber<T>
    {
        if (typeof(T) == typeof(ushort))
            return Unsafe.BitCast<ushort, T>((ushort)key);
        if (typeof(T) == typeof(short))
            return Unsafe.BitCast<short, T>((short)((short)key ^ short.MinValue));
        if (typeof(T) == typeof(float))
        {
            int bits = (int)key;
            return Unsafe.BitCast<int, T>(bits ^ (~(bits >> 31) | int.MinValue));
        }

        long wide = (long)key;
        return Unsafe.BitCast<long, T>(wide ^ (~(wide >> 63) | long.MinValue));
    }
}
