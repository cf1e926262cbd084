using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// What pairs of pixels p, q with p in rows y and y + 1 and q behind p add to sum_q w_pq c_q, or to
/// sum_q w_pq c_q (v_q - v_p), of both: each weight is computed once. w_pq = 2^(place_q - (guide_p - guide_q)^2). A block of
/// columns is done at a time, then dx after dx, so that the rows in use stay in the first cache.
/// </summary>
/// <typeparam name="T">float or double.</typeparam>
/// <typeparam name="TTerm"><see cref="OfFactors"/> or <see cref="OfChanges"/>.</typeparam>
/// <param name="kernel">The places q.</param>
/// <param name="exponents">log2 of their weights in space.</param>
/// <param name="planes">Guide and v.</param>
/// <param name="factors">c in a padded plane, 0 where a pixel takes no part.</param>
/// <param name="y">The first of the two rows.</param>
/// <param name="given">Two padded rows: receive what p in rows y and y + 1 get.</param>
/// <param name="taken">Padded rows y ... y + 1 + RadiusY: what q gets is added to them.</param>
internal readonly ref struct PairSums<T, TTerm>(
    SpatialKernel kernel, T[] exponents, GuidedPlanes<T> planes, Plane<T> factors, int y, Plane<T> given, Plane<T> taken) : IRealKernel<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
    where TTerm : struct, IPairTerm
{
    private const int Block = 128;

    private readonly ReadOnlySpan<int> heights = kernel.Heights;
    private readonly ref T places = ref MemoryMarshal.GetArrayDataReference(exponents);
    private readonly ref T values = ref planes.StartOfRow(planes.Values, y);
    private readonly ref T guide = ref planes.StartOfRow(planes.Guide, y);
    private readonly ref T factors = ref planes.StartOfRow(factors, y);
    private readonly ref T given = ref planes.StartOfRow(given, 0);
    private readonly ref T taken = ref planes.StartOfRow(taken, 0);
    private readonly int width = RealLanes.Padded(kernel.Width);
    private readonly int stride = kernel.Stride;
    private readonly int radius = kernel.RadiusX;

    /// <inheritdoc/>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    public void Compute<TLanes>()
        where TLanes : struct, IRealLanes<TLanes, T>
    {
        PowerOfTwo<TLanes, T> power = new();
        for (int block = 0; block < width; block += Block)
        {
            for (int dx = -radius; dx <= radius; dx++)
            {
                // q is behind p: in a later row, or in the same row to the right.
                int first = dx > 0 ? 0 : 1, last = heights[Math.Abs(dx)];
                if (last < first)
                    continue;
                for (int x = block; x < Math.Min(block + Block, width); x += TLanes.Count)
                    Column(x, dx, first, last, power);
            }
        }
    }

    /// <summary>Pairs of neighbouring p in both rows with the q that are dx columns and first ... last rows away.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private void Column<TLanes>(int x, int dx, int first, int last, PowerOfTwo<TLanes, T> power)
        where TLanes : struct, IRealLanes<TLanes, T>
    {
        nint second = (nint)stride + x, row = (nint)stride * first, side = (2 * radius) + 1, place = (first * side) + radius + dx;
        TLanes guide1 = TLanes.Load(ref guide, x), guide2 = TLanes.Load(ref guide, second);
        TLanes factor1 = TLanes.Load(ref factors, x), factor2 = TLanes.Load(ref factors, second);
        TLanes value1 = TLanes.Load(ref values, x), value2 = TLanes.Load(ref values, second);
        TLanes sum1 = TLanes.Load(ref given, x), sum2 = TLanes.Load(ref given, second);
        nint q = x + dx + row;
        TLanes got = TLanes.Load(ref taken, q);
        Add(power, q, place, guide1, factor1, value1, ref sum1, ref got);
        got.Store(ref taken, q);
        for (int dy = first + 1; dy <= last; dy++)
        {
            q += stride;
            got = TLanes.Load(ref taken, q);
            Add(power, q, place + side, guide1, factor1, value1, ref sum1, ref got);
            Add(power, q, place, guide2, factor2, value2, ref sum2, ref got);
            got.Store(ref taken, q);
            place += side;
        }

        q += stride;
        got = TLanes.Load(ref taken, q);
        Add(power, q, place, guide2, factor2, value2, ref sum2, ref got);
        got.Store(ref taken, q);
        sum1.Store(ref given, x);
        sum2.Store(ref given, second);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private void Add<TLanes>(PowerOfTwo<TLanes, T> power, nint q, nint place, TLanes ownGuide, TLanes ownFactor, TLanes ownValue, ref TLanes sum, ref TLanes got)
        where TLanes : struct, IRealLanes<TLanes, T>
    {
        TLanes apart = TLanes.Load(ref guide, q) - ownGuide;
        TLanes w = power.Of(TLanes.MultiplySubtract(apart, apart, TLanes.Repeat(ref places, place)));
        if (TTerm.HasValues)
        {
            TLanes change = w * (TLanes.Load(ref values, q) - ownValue);
            sum = TLanes.MultiplyAdd(change, TLanes.Load(ref factors, q), sum);
            got = TLanes.MultiplySubtract(change, ownFactor, got);
        }
        else
        {
            sum = TLanes.MultiplyAdd(w, TLanes.Load(ref factors, q), sum);
            got = TLanes.MultiplyAdd(w, ownFactor, got);
        }
    }
}

/// <summary>What <see cref="PairSums{T, TTerm}"/> sums.</summary>
internal interface IPairTerm
{
    /// <summary>True for w c (v_q - v_p), which q gets with the other sign; false for w c.</summary>
    static abstract bool HasValues { get; }
}

/// <summary>w_pq c_q.</summary>
internal readonly struct OfFactors : IPairTerm
{
    public static bool HasValues => false;
}

/// <summary>w_pq c_q (v_q - v_p).</summary>
internal readonly struct OfChanges : IPairTerm
{
    public static bool HasValues => true;
}
