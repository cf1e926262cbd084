using System.Numerics;
using System.Runtime.Intrinsics;

namespace Stacks.Imaging;

/// <summary>How many pixels a rank kernel works on at once. Results are the same bits at every width.</summary>
internal enum LaneWidth
{
    /// <summary>One pixel: the scalar form.</summary>
    Single = 0,

    /// <summary>128-bit vectors.</summary>
    Bits128 = 128,

    /// <summary>256-bit vectors.</summary>
    Bits256 = 256,

    /// <summary>512-bit vectors.</summary>
    Bits512 = 512,
}

/// <summary>What this machine runs.</summary>
internal static class LaneWidths
{
    /// <summary>The widest form that its hardware has.</summary>
    public static LaneWidth Widest { get; } =
        Vector512.IsHardwareAccelerated ? LaneWidth.Bits512
        : Vector256.IsHardwareAccelerated ? LaneWidth.Bits256
        : Vector128.IsHardwareAccelerated ? LaneWidth.Bits128
        : LaneWidth.Single;
}

/// <summary>The two operations of a comparator, on one pixel or on a vector of pixels. Samples are never NaN.</summary>
/// <typeparam name="TVector">A sample, or a vector of samples.</typeparam>
internal interface ILanes<TVector>
{
    /// <summary>The lower of two samples, lane by lane.</summary>
    static abstract TVector Min(TVector a, TVector b);

    /// <summary>The higher of two samples, lane by lane.</summary>
    static abstract TVector Max(TVector a, TVector b);

    /// <summary>A sample, a negative zero as zero.</summary>
    static abstract TVector WithoutNegativeZero(TVector a);
}

/// <summary>The scalar form.</summary>
internal readonly struct SingleLane<T> : ILanes<T>
    where T : unmanaged, INumber<T>
{
    public static T Min(T a, T b) => b < a ? b : a;

    public static T Max(T a, T b) => b < a ? a : b;

    public static T WithoutNegativeZero(T a) => a + T.Zero;
}

/// <summary>128-bit form.</summary>
internal readonly struct Lanes128<T> : ILanes<Vector128<T>>
    where T : unmanaged
{
    public static Vector128<T> Min(Vector128<T> a, Vector128<T> b) => Vector128.MinNative(a, b);

    public static Vector128<T> Max(Vector128<T> a, Vector128<T> b) => Vector128.MaxNative(a, b);

    public static Vector128<T> WithoutNegativeZero(Vector128<T> a) => a + Vector128<T>.Zero;
}

/// <summary>256-bit form.</summary>
internal readonly struct Lanes256<T> : ILanes<Vector256<T>>
    where T : unmanaged
{
    public static Vector256<T> Min(Vector256<T> a, Vector256<T> b) => Vector256.MinNative(a, b);

    public static Vector256<T> Max(Vector256<T> a, Vector256<T> b) => Vector256.MaxNative(a, b);

    public static Vector256<T> WithoutNegativeZero(Vector256<T> a) => a + Vector256<T>.Zero;
}

/// <summary>512-bit form.</summary>
internal readonly struct Lanes512<T> : ILanes<Vector512<T>>
    where T : unmanaged
{
    public static Vector512<T> Min(Vector512<T> a, Vector512<T> b) => Vector512.MinNative(a, b);

    public static Vector512<T> Max(Vector512<T> a, Vector512<T> b) => Vector512.MaxNative(a, b);

    public static Vector512<T> WithoutNegativeZero(Vector512<T> a) => a + Vector512<T>.Zero;
}
