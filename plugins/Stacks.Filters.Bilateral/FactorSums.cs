using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// sum_q w_pq c_q of every p of row <paramref name="y"/>, in the order and with the weights of <see cref="PixelSums{T}"/>.
/// </summary>
/// <param name="kernel">The places q.</param>
/// <param name="exponents">log2 of their weights in space.</param>
/// <param name="planes">Guide.</param>
/// <param name="factors">c in a padded plane, 0 where a pixel takes no part.</param>
/// <param name="y">Row of p.</param>
/// <param name="sums">Receives the sums, one for each column in whole vectors.</param>
internal readonly ref struct FactorSums<T>(SpatialKernel kernel, T[] exponents, GuidedPlanes<T> planes, Plane<T> factors, int y, Span<T> sums) : IRealKernel<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private readonly ReadOnlySpan<int> halfWidths = kernel.HalfWidths;
    private readonly ref T places = ref MemoryMarshal.GetArrayDataReference(exponents);
    private readonly ref T factors = ref planes.StartOfRow(factors, y);
    private readonly ref T guide = ref planes.StartOfRow(planes.Guide, y);
    private readonly ref T sums = ref sums[0];
    private readonly int stride = kernel.Stride;
    private readonly int radius = kernel.RadiusX;
    private readonly int first = -Math.Min(y, kernel.RadiusY);
    private readonly int last = Math.Min(kernel.Height - 1 - y, kernel.RadiusY);

    /// <inheritdoc/>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    public void At<TLanes>(int x)
        where TLanes : struct, IRealLanes<TLanes, T>
    {
        TLanes ownGuide = TLanes.Load(ref guide, x), sum = TLanes.All(0);
        for (int dy = first; dy <= last; dy++)
        {
            int half = halfWidths[Math.Abs(dy)];
            nint row = ((nint)dy * stride) + x, place = ((nint)Math.Abs(dy) * ((2 * radius) + 1)) + radius;
            TLanes rowSum = TLanes.All(0);
            for (nint dx = -half; dx <= half; dx++)
            {
                TLanes apart = TLanes.Load(ref guide, row + dx) - ownGuide;
                TLanes w = PowerOfTwo.Of<TLanes, T>(TLanes.MultiplySubtract(apart, apart, TLanes.Repeat(ref places, place + dx)));
                rowSum = TLanes.MultiplyAdd(w, TLanes.Load(ref factors, row + dx), rowSum);
            }

            sum += rowSum;
        }

        sum.Store(ref sums, x);
    }
}
