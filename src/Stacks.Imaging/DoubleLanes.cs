using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using System.Runtime.Intrinsics.X86;

namespace Stacks.Imaging;

/// <summary>Runs kernels over the pixels of a row.</summary>
public static class DoubleLanes
{
    /// <summary>Lanes of the widest form this machine runs: 8, 4, 2, or 1 without vectors.</summary>
    public static int Widest { get; } =
        Vector512.IsHardwareAccelerated ? DoubleLanes512.Count
        : Vector256.IsHardwareAccelerated ? DoubleLanes256.Count
        : Vector128.IsHardwareAccelerated ? DoubleLanes128.Count
        : DoubleLane.Count;

    /// <summary>Computes columns [0, width): whole vectors, then pixel by pixel.</summary>
    /// <param name="kernel">The kernel.</param>
    /// <param name="width">Pixels in the row.</param>
    /// <param name="lanes">8, 4, 2 or 1.</param>
    public static void Run<TKernel>(TKernel kernel, int width, int lanes)
        where TKernel : struct, IPixelKernel, allows ref struct
    {
        int x = lanes switch
        {
            8 => Run<TKernel, DoubleLanes512>(kernel, 0, width),
            4 => Run<TKernel, DoubleLanes256>(kernel, 0, width),
            2 => Run<TKernel, DoubleLanes128>(kernel, 0, width),
            _ => 0,
        };
        Run<TKernel, DoubleLane>(kernel, x, width);
    }

    private static int Run<TKernel, TLanes>(TKernel kernel, int x, int width)
        where TKernel : struct, IPixelKernel, allows ref struct
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        for (; x <= width - TLanes.Count; x += TLanes.Count)
            kernel.At<TLanes>(x);
        return x;
    }
}

/// <summary>512-bit form.</summary>
public readonly struct DoubleLanes512(Vector512<double> lanes) : IDoubleLanes<DoubleLanes512>
{
    private readonly Vector512<double> lanes = lanes;

    /// <inheritdoc/>
    public static int Count => 8;

    /// <inheritdoc/>
    public static DoubleLanes512 All(double value) => new(Vector512.Create(value));

    /// <inheritdoc/>
    public static DoubleLanes512 Load(ref double start, nint offset) => new(Vector512.LoadUnsafe(ref Unsafe.Add(ref start, offset)));

    /// <inheritdoc/>
    public static DoubleLanes512 Load(ref float start, nint offset) =>
        new(Vector512.WidenLower(Vector256.LoadUnsafe(ref Unsafe.Add(ref start, offset)).ToVector512Unsafe()));

    /// <inheritdoc/>
    public void Store(ref double start, nint offset) => lanes.StoreUnsafe(ref Unsafe.Add(ref start, offset));

    /// <inheritdoc/>
    public void Store(ref float start, nint offset) =>
        (Avx512F.IsSupported ? Avx512F.ConvertToVector256Single(lanes) : Vector512.Narrow(lanes, lanes).GetLower()).StoreUnsafe(ref Unsafe.Add(ref start, offset));

    /// <inheritdoc/>
    public static DoubleLanes512 Min(DoubleLanes512 a, DoubleLanes512 b) => new(Vector512.MinNative(a.lanes, b.lanes));

    /// <inheritdoc/>
    public static bool AllAtLeast(DoubleLanes512 a, DoubleLanes512 b) => Vector512.GreaterThanOrEqualAll(a.lanes, b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes512 operator +(DoubleLanes512 a, DoubleLanes512 b) => new(a.lanes + b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes512 operator -(DoubleLanes512 a, DoubleLanes512 b) => new(a.lanes - b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes512 operator *(DoubleLanes512 a, DoubleLanes512 b) => new(a.lanes * b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes512 operator /(DoubleLanes512 a, DoubleLanes512 b) => new(a.lanes / b.lanes);
}

/// <summary>256-bit form.</summary>
public readonly struct DoubleLanes256(Vector256<double> lanes) : IDoubleLanes<DoubleLanes256>
{
    private readonly Vector256<double> lanes = lanes;

    /// <inheritdoc/>
    public static int Count => 4;

    /// <inheritdoc/>
    public static DoubleLanes256 All(double value) => new(Vector256.Create(value));

    /// <inheritdoc/>
    public static DoubleLanes256 Load(ref double start, nint offset) => new(Vector256.LoadUnsafe(ref Unsafe.Add(ref start, offset)));

    /// <inheritdoc/>
    public static DoubleLanes256 Load(ref float start, nint offset) =>
        new(Vector256.WidenLower(Vector128.LoadUnsafe(ref Unsafe.Add(ref start, offset)).ToVector256Unsafe()));

    /// <inheritdoc/>
    public void Store(ref double start, nint offset) => lanes.StoreUnsafe(ref Unsafe.Add(ref start, offset));

    /// <inheritdoc/>
    public void Store(ref float start, nint offset) =>
        (Avx.IsSupported ? Avx.ConvertToVector128Single(lanes) : Vector256.Narrow(lanes, lanes).GetLower()).StoreUnsafe(ref Unsafe.Add(ref start, offset));

    /// <inheritdoc/>
    public static DoubleLanes256 Min(DoubleLanes256 a, DoubleLanes256 b) => new(Vector256.MinNative(a.lanes, b.lanes));

    /// <inheritdoc/>
    public static bool AllAtLeast(DoubleLanes256 a, DoubleLanes256 b) => Vector256.GreaterThanOrEqualAll(a.lanes, b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes256 operator +(DoubleLanes256 a, DoubleLanes256 b) => new(a.lanes + b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes256 operator -(DoubleLanes256 a, DoubleLanes256 b) => new(a.lanes - b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes256 operator *(DoubleLanes256 a, DoubleLanes256 b) => new(a.lanes * b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes256 operator /(DoubleLanes256 a, DoubleLanes256 b) => new(a.lanes / b.lanes);
}

/// <summary>128-bit form.</summary>
public readonly struct DoubleLanes128(Vector128<double> lanes) : IDoubleLanes<DoubleLanes128>
{
    private readonly Vector128<double> lanes = lanes;

    /// <inheritdoc/>
    public static int Count => 2;

    /// <inheritdoc/>
    public static DoubleLanes128 All(double value) => new(Vector128.Create(value));

    /// <inheritdoc/>
    public static DoubleLanes128 Load(ref double start, nint offset) => new(Vector128.LoadUnsafe(ref Unsafe.Add(ref start, offset)));

    /// <inheritdoc/>
    public static DoubleLanes128 Load(ref float start, nint offset) =>
        new(Vector128.WidenLower(Vector64.LoadUnsafe(ref Unsafe.Add(ref start, offset)).ToVector128Unsafe()));

    /// <inheritdoc/>
    public void Store(ref double start, nint offset) => lanes.StoreUnsafe(ref Unsafe.Add(ref start, offset));

    /// <inheritdoc/>
    public void Store(ref float start, nint offset) => Vector128.Narrow(lanes, lanes).GetLower().StoreUnsafe(ref Unsafe.Add(ref start, offset));

    /// <inheritdoc/>
    public static DoubleLanes128 Min(DoubleLanes128 a, DoubleLanes128 b) => new(Vector128.MinNative(a.lanes, b.lanes));

    /// <inheritdoc/>
    public static bool AllAtLeast(DoubleLanes128 a, DoubleLanes128 b) => Vector128.GreaterThanOrEqualAll(a.lanes, b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes128 operator +(DoubleLanes128 a, DoubleLanes128 b) => new(a.lanes + b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes128 operator -(DoubleLanes128 a, DoubleLanes128 b) => new(a.lanes - b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes128 operator *(DoubleLanes128 a, DoubleLanes128 b) => new(a.lanes * b.lanes);

    /// <inheritdoc/>
    public static DoubleLanes128 operator /(DoubleLanes128 a, DoubleLanes128 b) => new(a.lanes / b.lanes);
}

/// <summary>The scalar form: one lane.</summary>
public readonly struct DoubleLane(double lane) : IDoubleLanes<DoubleLane>
{
    private readonly double lane = lane;

    /// <inheritdoc/>
    public static int Count => 1;

    /// <inheritdoc/>
    public static DoubleLane All(double value) => new(value);

    /// <inheritdoc/>
    public static DoubleLane Load(ref double start, nint offset) => new(Unsafe.Add(ref start, offset));

    /// <inheritdoc/>
    public static DoubleLane Load(ref float start, nint offset) => new(Unsafe.Add(ref start, offset));

    /// <inheritdoc/>
    public void Store(ref double start, nint offset) => Unsafe.Add(ref start, offset) = lane;

    /// <inheritdoc/>
    public void Store(ref float start, nint offset) => Unsafe.Add(ref start, offset) = (float)lane;

    /// <inheritdoc/>
    public static DoubleLane Min(DoubleLane a, DoubleLane b) => new(a.lane < b.lane ? a.lane : b.lane);

    /// <inheritdoc/>
    public static bool AllAtLeast(DoubleLane a, DoubleLane b) => a.lane >= b.lane;

    /// <inheritdoc/>
    public static DoubleLane operator +(DoubleLane a, DoubleLane b) => new(a.lane + b.lane);

    /// <inheritdoc/>
    public static DoubleLane operator -(DoubleLane a, DoubleLane b) => new(a.lane - b.lane);

    /// <inheritdoc/>
    public static DoubleLane operator *(DoubleLane a, DoubleLane b) => new(a.lane * b.lane);

    /// <inheritdoc/>
    public static DoubleLane operator /(DoubleLane a, DoubleLane b) => new(a.lane / b.lane);
}
