using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using System.Runtime.Intrinsics.X86;

namespace Stacks.Imaging;

/// <summary>Runs kernels in vectors of a given width.</summary>
public static class RealLanes
{
    /// <summary>Pixels that every width goes into; rows of kernels are padded to a multiple of it.</summary>
    public const int Most = 16;

    /// <summary>Added to a whole n, it leaves n + 127 in the low bits: the exponent of 2^n.</summary>
    internal const float FloatBias = (1.5f * (1 << 23)) + 127;

    /// <summary>The same in double, n + 1023.</summary>
    internal const double DoubleBias = (1.5 * (1L << 52)) + 1023;

    /// <summary>Bits of the widest vectors this machine runs: 512, 256, 128, or 0 without vectors.</summary>
    public static int Widest { get; } =
        Vector512.IsHardwareAccelerated ? 512 : Vector256.IsHardwareAccelerated ? 256 : Vector128.IsHardwareAccelerated ? 128 : 0;

    /// <summary>Computes a kernel.</summary>
    /// <param name="kernel">The kernel.</param>
    /// <param name="bits">Width of vectors in bits: 512, 256, 128, or 0 for the scalar form.</param>
    public static void Run<TKernel, T>(TKernel kernel, int bits)
        where TKernel : struct, IRealKernel<T>, allows ref struct
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        switch (bits)
        {
            case 512:
                kernel.Compute<RealLanes512<T>>();
                break;
            case 256:
                kernel.Compute<RealLanes256<T>>();
                break;
            case 128:
                kernel.Compute<RealLanes128<T>>();
                break;
            default:
                kernel.Compute<RealLane<T>>();
                break;
        }
    }

    /// <summary>A width rounded up to a multiple of <see cref="Most"/>.</summary>
    public static int Padded(int width) => checked(width + Most - 1) / Most * Most;
}

/// <summary>512-bit form.</summary>
internal readonly struct RealLanes512<T>(Vector512<T> lanes) : IRealLanes<RealLanes512<T>, T>
    where T : unmanaged
{
    private readonly Vector512<T> lanes = lanes;

    public static int Count => Vector512<T>.Count;

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> All(double value) => typeof(T) == typeof(float)
        ? new(Vector512.Create((float)value).As<float, T>())
        : new(Vector512.Create(value).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> Load(ref T start, nint offset) => new(Vector512.LoadUnsafe(ref Unsafe.Add(ref start, offset)));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> Repeat(ref T start, nint offset) => new(Vector512.Create(Unsafe.Add(ref start, offset)));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public void Store(ref T start, nint offset) => lanes.StoreUnsafe(ref Unsafe.Add(ref start, offset));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> Max(RealLanes512<T> a, RealLanes512<T> b) => new(Vector512.MaxNative(a.lanes, b.lanes));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> MultiplyAdd(RealLanes512<T> a, RealLanes512<T> b, RealLanes512<T> c) => typeof(T) == typeof(float)
        ? new(Vector512.FusedMultiplyAdd(a.lanes.AsSingle(), b.lanes.AsSingle(), c.lanes.AsSingle()).As<float, T>())
        : new(Vector512.FusedMultiplyAdd(a.lanes.AsDouble(), b.lanes.AsDouble(), c.lanes.AsDouble()).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> MultiplySubtract(RealLanes512<T> a, RealLanes512<T> b, RealLanes512<T> c)
    {
        if (Avx512F.IsSupported)
        {
            return typeof(T) == typeof(float)
                ? new(Avx512F.FusedMultiplyAddNegated(a.lanes.AsSingle(), b.lanes.AsSingle(), c.lanes.AsSingle()).As<float, T>())
                : new(Avx512F.FusedMultiplyAddNegated(a.lanes.AsDouble(), b.lanes.AsDouble(), c.lanes.AsDouble()).As<double, T>());
        }

        return MultiplyAdd(new(-a.lanes), b, c);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> Round(RealLanes512<T> a) => typeof(T) == typeof(float)
        ? new(Vector512.Round(a.lanes.AsSingle()).As<float, T>())
        : new(Vector512.Round(a.lanes.AsDouble()).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> Scale(RealLanes512<T> a, RealLanes512<T> n)
    {
        if (Avx512F.IsSupported)
        {
            return typeof(T) == typeof(float)
                ? new(Avx512F.Scale(a.lanes.AsSingle(), n.lanes.AsSingle()).As<float, T>())
                : new(Avx512F.Scale(a.lanes.AsDouble(), n.lanes.AsDouble()).As<double, T>());
        }

        return typeof(T) == typeof(float)
            ? new(a.lanes * Vector512.ShiftLeft((n.lanes.AsSingle() + Vector512.Create(RealLanes.FloatBias)).AsInt32(), 23).As<int, T>())
            : new(a.lanes * Vector512.ShiftLeft((n.lanes.AsDouble() + Vector512.Create(RealLanes.DoubleBias)).AsInt64(), 52).As<long, T>());
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> Sqrt(RealLanes512<T> a) => new(Vector512.Sqrt(a.lanes));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> operator +(RealLanes512<T> a, RealLanes512<T> b) => new(a.lanes + b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> operator -(RealLanes512<T> a, RealLanes512<T> b) => new(a.lanes - b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> operator *(RealLanes512<T> a, RealLanes512<T> b) => new(a.lanes * b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes512<T> operator /(RealLanes512<T> a, RealLanes512<T> b) => new(a.lanes / b.lanes);
}

/// <summary>256-bit form.</summary>
internal readonly struct RealLanes256<T>(Vector256<T> lanes) : IRealLanes<RealLanes256<T>, T>
    where T : unmanaged
{
    private readonly Vector256<T> lanes = lanes;

    public static int Count => Vector256<T>.Count;

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> All(double value) => typeof(T) == typeof(float)
        ? new(Vector256.Create((float)value).As<float, T>())
        : new(Vector256.Create(value).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> Load(ref T start, nint offset) => new(Vector256.LoadUnsafe(ref Unsafe.Add(ref start, offset)));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> Repeat(ref T start, nint offset) => new(Vector256.Create(Unsafe.Add(ref start, offset)));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public void Store(ref T start, nint offset) => lanes.StoreUnsafe(ref Unsafe.Add(ref start, offset));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> Max(RealLanes256<T> a, RealLanes256<T> b) => new(Vector256.MaxNative(a.lanes, b.lanes));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> MultiplyAdd(RealLanes256<T> a, RealLanes256<T> b, RealLanes256<T> c) => typeof(T) == typeof(float)
        ? new(Vector256.FusedMultiplyAdd(a.lanes.AsSingle(), b.lanes.AsSingle(), c.lanes.AsSingle()).As<float, T>())
        : new(Vector256.FusedMultiplyAdd(a.lanes.AsDouble(), b.lanes.AsDouble(), c.lanes.AsDouble()).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> MultiplySubtract(RealLanes256<T> a, RealLanes256<T> b, RealLanes256<T> c)
    {
        if (Fma.IsSupported)
        {
            return typeof(T) == typeof(float)
                ? new(Fma.MultiplyAddNegated(a.lanes.AsSingle(), b.lanes.AsSingle(), c.lanes.AsSingle()).As<float, T>())
                : new(Fma.MultiplyAddNegated(a.lanes.AsDouble(), b.lanes.AsDouble(), c.lanes.AsDouble()).As<double, T>());
        }

        return MultiplyAdd(new(-a.lanes), b, c);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> Round(RealLanes256<T> a) => typeof(T) == typeof(float)
        ? new(Vector256.Round(a.lanes.AsSingle()).As<float, T>())
        : new(Vector256.Round(a.lanes.AsDouble()).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> Scale(RealLanes256<T> a, RealLanes256<T> n)
    {
        return typeof(T) == typeof(float)
            ? new(a.lanes * Vector256.ShiftLeft((n.lanes.AsSingle() + Vector256.Create(RealLanes.FloatBias)).AsInt32(), 23).As<int, T>())
            : new(a.lanes * Vector256.ShiftLeft((n.lanes.AsDouble() + Vector256.Create(RealLanes.DoubleBias)).AsInt64(), 52).As<long, T>());
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> Sqrt(RealLanes256<T> a) => new(Vector256.Sqrt(a.lanes));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> operator +(RealLanes256<T> a, RealLanes256<T> b) => new(a.lanes + b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> operator -(RealLanes256<T> a, RealLanes256<T> b) => new(a.lanes - b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> operator *(RealLanes256<T> a, RealLanes256<T> b) => new(a.lanes * b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes256<T> operator /(RealLanes256<T> a, RealLanes256<T> b) => new(a.lanes / b.lanes);
}

/// <summary>128-bit form.</summary>
internal readonly struct RealLanes128<T>(Vector128<T> lanes) : IRealLanes<RealLanes128<T>, T>
    where T : unmanaged
{
    private readonly Vector128<T> lanes = lanes;

    public static int Count => Vector128<T>.Count;

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> All(double value) => typeof(T) == typeof(float)
        ? new(Vector128.Create((float)value).As<float, T>())
        : new(Vector128.Create(value).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> Load(ref T start, nint offset) => new(Vector128.LoadUnsafe(ref Unsafe.Add(ref start, offset)));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> Repeat(ref T start, nint offset) => new(Vector128.Create(Unsafe.Add(ref start, offset)));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public void Store(ref T start, nint offset) => lanes.StoreUnsafe(ref Unsafe.Add(ref start, offset));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> Max(RealLanes128<T> a, RealLanes128<T> b) => new(Vector128.MaxNative(a.lanes, b.lanes));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> MultiplyAdd(RealLanes128<T> a, RealLanes128<T> b, RealLanes128<T> c) => typeof(T) == typeof(float)
        ? new(Vector128.FusedMultiplyAdd(a.lanes.AsSingle(), b.lanes.AsSingle(), c.lanes.AsSingle()).As<float, T>())
        : new(Vector128.FusedMultiplyAdd(a.lanes.AsDouble(), b.lanes.AsDouble(), c.lanes.AsDouble()).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> MultiplySubtract(RealLanes128<T> a, RealLanes128<T> b, RealLanes128<T> c)
    {
        if (Fma.IsSupported)
        {
            return typeof(T) == typeof(float)
                ? new(Fma.MultiplyAddNegated(a.lanes.AsSingle(), b.lanes.AsSingle(), c.lanes.AsSingle()).As<float, T>())
                : new(Fma.MultiplyAddNegated(a.lanes.AsDouble(), b.lanes.AsDouble(), c.lanes.AsDouble()).As<double, T>());
        }

        return MultiplyAdd(new(-a.lanes), b, c);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> Round(RealLanes128<T> a) => typeof(T) == typeof(float)
        ? new(Vector128.Round(a.lanes.AsSingle()).As<float, T>())
        : new(Vector128.Round(a.lanes.AsDouble()).As<double, T>());

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> Scale(RealLanes128<T> a, RealLanes128<T> n)
    {
        return typeof(T) == typeof(float)
            ? new(a.lanes * Vector128.ShiftLeft((n.lanes.AsSingle() + Vector128.Create(RealLanes.FloatBias)).AsInt32(), 23).As<int, T>())
            : new(a.lanes * Vector128.ShiftLeft((n.lanes.AsDouble() + Vector128.Create(RealLanes.DoubleBias)).AsInt64(), 52).As<long, T>());
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> Sqrt(RealLanes128<T> a) => new(Vector128.Sqrt(a.lanes));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> operator +(RealLanes128<T> a, RealLanes128<T> b) => new(a.lanes + b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> operator -(RealLanes128<T> a, RealLanes128<T> b) => new(a.lanes - b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> operator *(RealLanes128<T> a, RealLanes128<T> b) => new(a.lanes * b.lanes);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLanes128<T> operator /(RealLanes128<T> a, RealLanes128<T> b) => new(a.lanes / b.lanes);
}

/// <summary>The scalar form: one lane.</summary>
internal readonly struct RealLane<T>(T lane) : IRealLanes<RealLane<T>, T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private readonly T lane = lane;

    public static int Count => 1;

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> All(double value) => new(T.CreateTruncating(value));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> Load(ref T start, nint offset) => new(Unsafe.Add(ref start, offset));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> Repeat(ref T start, nint offset) => new(Unsafe.Add(ref start, offset));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public void Store(ref T start, nint offset) => Unsafe.Add(ref start, offset) = lane;

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> Max(RealLane<T> a, RealLane<T> b) => new(b.lane < a.lane ? a.lane : b.lane);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> MultiplyAdd(RealLane<T> a, RealLane<T> b, RealLane<T> c) => new(T.FusedMultiplyAdd(a.lane, b.lane, c.lane));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> MultiplySubtract(RealLane<T> a, RealLane<T> b, RealLane<T> c) => new(T.FusedMultiplyAdd(-a.lane, b.lane, c.lane));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> Round(RealLane<T> a) => new(T.Round(a.lane));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> Scale(RealLane<T> a, RealLane<T> n) => new(T.ScaleB(a.lane, int.CreateTruncating(n.lane)));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> Sqrt(RealLane<T> a) => new(T.Sqrt(a.lane));

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> operator +(RealLane<T> a, RealLane<T> b) => new(a.lane + b.lane);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> operator -(RealLane<T> a, RealLane<T> b) => new(a.lane - b.lane);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> operator *(RealLane<T> a, RealLane<T> b) => new(a.lane * b.lane);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static RealLane<T> operator /(RealLane<T> a, RealLane<T> b) => new(a.lane / b.lane);
}
