using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The change of every p of row <paramref name="y"/>: sum_q w_pq (v_q - v_p) / sum_q w_pq, with
/// w_pq = 2^(place_q - (guide_p - guide_q)^2). Each row of q is summed by itself, left to right; the rows are added from the
/// first to the last.
/// </summary>
/// <param name="kernel">The places q.</param>
/// <param name="exponents">log2 of their weights in space.</param>
/// <param name="planes">Guide and v.</param>
/// <param name="y">Row of p.</param>
/// <param name="changes">Receives the changes, one for each column in whole vectors.</param>
internal readonly ref struct PixelSums<T>(SpatialKernel kernel, T[] exponents, GuidedPlanes<T> planes, int y, Span<T> changes) : IRealKernel<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private readonly ReadOnlySpan<int> halfWidths = kernel.HalfWidths;
    private readonly ref T places = ref MemoryMarshal.GetArrayDataReference(exponents);
    private readonly ref T values = ref planes.StartOfRow(planes.Values, y);
    private readonly ref T guide = ref planes.StartOfRow(planes.Guide, y);
    private readonly ref T changes = ref changes[0];
    private readonly int width = kernel.Width;
    private readonly int stride = kernel.Stride;
    private readonly int radius = kernel.RadiusX;
    private readonly int first = -Math.Min(y, kernel.RadiusY);
    private readonly int last = Math.Min(kernel.Height - 1 - y, kernel.RadiusY);

    /// <inheritdoc/>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    public void Compute<TLanes>()
        where TLanes : struct, IRealLanes<TLanes, T>
    {
        PowerOfTwo<TLanes, T> power = new();
        for (int x = 0; x < width; x += TLanes.Count)
            Pixels(x, power);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private void Pixels<TLanes>(int x, PowerOfTwo<TLanes, T> power)
        where TLanes : struct, IRealLanes<TLanes, T>
    {
        TLanes ownValue = TLanes.Load(ref values, x), ownGuide = TLanes.Load(ref guide, x);
        TLanes weight = TLanes.All(0), change = TLanes.All(0);
        for (int dy = first; dy <= last; dy++)
        {
            int half = halfWidths[Math.Abs(dy)];
            nint row = ((nint)dy * stride) + x, place = ((nint)Math.Abs(dy) * ((2 * radius) + 1)) + radius;
            TLanes rowWeight = TLanes.All(0), rowChange = TLanes.All(0);
            for (nint dx = -half; dx <= half; dx++)
            {
                TLanes apart = TLanes.Load(ref guide, row + dx) - ownGuide;
                TLanes w = power.Of(TLanes.MultiplySubtract(apart, apart, TLanes.Repeat(ref places, place + dx)));
                rowWeight += w;
                rowChange = TLanes.MultiplyAdd(w, TLanes.Load(ref values, row + dx) - ownValue, rowChange);
            }

            weight += rowWeight;
            change += rowChange;
        }

        (change / weight).Store(ref changes, x);
    }
}
