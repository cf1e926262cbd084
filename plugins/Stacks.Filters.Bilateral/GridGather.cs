using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// Reads the blurred nodes at every sample p, the transpose of <see cref="GridSpread{T, TForm, TLanes}"/>:
/// sum_n b_n(p) g_l(p) over nodes and levels gives sum_q w_pq c_q, and with v_q - v_p as (v_q - o) + (o - v_p), o the
/// level's value, sum_q w_pq c_q (v_q - v_p): a pedestal costs no digits, and constants stay exact.
/// </summary>
internal sealed class GridGather<T, TForm, TLanes>(LevelFrame<T> frame, Plane<float> sums, Plane<float> exchanges)
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
    where TForm : struct, IPassForm
    where TLanes : struct, ILevelLanes<TLanes>
{
    private const int Support = SpatialGrid.Support;
    private const int LonerBits = 16;

    private readonly SpatialGrid grid = frame.Grid;
    private readonly LevelWeights weights = frame.Weights;
    private readonly GuideLevels guide = frame.Guide;
    private readonly LevelSlots slots = frame.Slots;
    private readonly TileCrowds crowds = frame.Crowds;
    private readonly GridNodes nodes = frame.Nodes;
    private readonly Plane<T> values = frame.Values;

    /// <summary>Adds to the sums of a tile's samples.</summary>
    /// <param name="tileX">Column of the tile.</param>
    /// <param name="tileY">Row of the tile.</param>
    /// <param name="loners">Scratch, as long as a tile has samples.</param>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    public void Tile(int tileX, int tileY, int[] loners)
    {
        CrowdTile tile = new(grid, crowds, slots, weights, tileX, tileY);
        if (tile.IsEmpty)
            return;
        int crowd = tile.Crowd, slot = tile.Slot, columns = tile.Columns, rows = tile.Rows;
        uint room = tile.Room;
        double origin = tile.Origin;
        int alone = 0;
        LevelWeights.LevelTable table = weights.Table;

        TLanes offsets = TForm.Values && slot >= 0 ? slots.Sixteen<TLanes>(slot, origin) : TLanes.All(0);
        ref float spline = ref MemoryMarshal.GetArrayDataReference(grid.Spline);
        ref float node = ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(nodes.Sums.Buffer), nodes.Start(tileX, tileY) + Math.Max(slot, 0));
        nint nextX = nodes.Stride, nextY = (nint)grid.NodesX * nodes.Stride, toValues = nodes.Slots;

        for (int y = 0; y < rows; y++)
        {
            int start = ((tile.Top + y) * grid.Width) + tile.Left;
            ref int samples = ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(guide.Samples.Buffer), start);
            ref T v = ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(values.Buffer), start);
            ref float sum = ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(sums.Buffer), start);
            ref float change = ref TForm.Values ? ref exchanges.Buffer[start] : ref spline;
            TLanes w0 = TLanes.All(0), w1 = w0, w2 = w0, w3 = w0, e0 = w0, e1 = w0, e2 = w0, e3 = w0;
            for (int j = 0; slot >= 0 && j < Support; j++)
            {
                TLanes b = TLanes.All(Unsafe.Add(ref spline, (Support * y) + j));
                nint at = j * nextY;
                w0 = TLanes.MultiplyAdd(TLanes.Load(ref node, at), b, w0);
                w1 = TLanes.MultiplyAdd(TLanes.Load(ref node, at + nextX), b, w1);
                w2 = TLanes.MultiplyAdd(TLanes.Load(ref node, at + (2 * nextX)), b, w2);
                w3 = TLanes.MultiplyAdd(TLanes.Load(ref node, at + (3 * nextX)), b, w3);
                if (TForm.Values)
                {
                    at += toValues;
                    e0 = TLanes.MultiplyAdd(TLanes.Load(ref node, at), b, e0);
                    e1 = TLanes.MultiplyAdd(TLanes.Load(ref node, at + nextX), b, e1);
                    e2 = TLanes.MultiplyAdd(TLanes.Load(ref node, at + (2 * nextX)), b, e2);
                    e3 = TLanes.MultiplyAdd(TLanes.Load(ref node, at + (3 * nextX)), b, e3);
                }
            }

            for (int x = 0; x < columns; x++)
            {
                int sample = Unsafe.Add(ref samples, x);
                int above = (sample >> LevelWeights.FractionBits) - crowd;
                if ((uint)above >= room)
                {
                    loners[alone] = (y << LonerBits) + x;
                    alone += sample >= 0 ? 1 : 0;
                    continue;
                }

                TLanes weight = table.Of<TLanes>(sample, above);
                ref float b = ref Unsafe.Add(ref spline, Support * x);
                TLanes b0 = TLanes.All(b), b1 = TLanes.All(Unsafe.Add(ref b, 1)), b2 = TLanes.All(Unsafe.Add(ref b, 2)), b3 = TLanes.All(Unsafe.Add(ref b, 3));
                TLanes total = TLanes.MultiplyAdd(w3, b3, TLanes.MultiplyAdd(w2, b2, TLanes.MultiplyAdd(w1, b1, w0 * b0))) * weight;
                Unsafe.Add(ref sum, x) += total.Sum();
                if (TForm.Values)
                {
                    TLanes exchange = TLanes.MultiplyAdd(e3, b3, TLanes.MultiplyAdd(e2, b2, TLanes.MultiplyAdd(e1, b1, e0 * b0)));
                    TLanes apart = offsets - TLanes.All(LevelSlots.From(origin, Unsafe.Add(ref v, x)));
                    Unsafe.Add(ref change, x) += TLanes.MultiplyAdd(exchange, weight, total * apart).Sum();
                }
            }
        }

        for (int i = 0; i < alone; i++)
            GatherLoner(tileX, tileY, loners[i] & ((1 << LonerBits) - 1), loners[i] >> LonerBits);
    }

    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private void GatherLoner(int tileX, int tileY, int x, int y)
    {
        int at = (((tileY * grid.Pitch) + y) * grid.Width) + (tileX * grid.Pitch) + x;
        int sample = guide.Samples.Buffer[at];
        int slot = slots.SixteenAt(sample >> LevelWeights.FractionBits);
        if (slot < 0)
            return;
        TLanes total = TLanes.All(0), exchange = total;
        ref float spline = ref MemoryMarshal.GetArrayDataReference(grid.Spline);
        ref float row = ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(nodes.Sums.Buffer), nodes.Start(tileX, tileY) + slot);
        nint nextX = nodes.Stride, nextY = (nint)grid.NodesX * nodes.Stride, toValues = nodes.Slots;
        for (int j = 0; j < Support; j++, row = ref Unsafe.Add(ref row, nextY))
        {
            TLanes w = TLanes.All(0), e = w, alongY = TLanes.All(Unsafe.Add(ref spline, (Support * y) + j));
            for (int i = 0; i < Support; i++)
            {
                TLanes alongX = TLanes.All(Unsafe.Add(ref spline, (Support * x) + i));
                w = TLanes.MultiplyAdd(TLanes.Load(ref row, i * nextX), alongX, w);
                if (TForm.Values)
                    e = TLanes.MultiplyAdd(TLanes.Load(ref row, (i * nextX) + toValues), alongX, e);
            }

            total = TLanes.MultiplyAdd(w, alongY, total);
            exchange = TLanes.MultiplyAdd(e, alongY, exchange);
        }

        TLanes weight = weights.Of<TLanes>(sample);
        total *= weight;
        sums.Buffer[at] += total.Sum();
        if (TForm.Values)
        {
            TLanes apart = slots.Sixteen<TLanes>(slot, slots.Value(slot)) - TLanes.All(LevelSlots.From(slots.Value(slot), values.Buffer[at]));
            exchanges.Buffer[at] += TLanes.MultiplyAdd(exchange, weight, total * apart).Sum();
        }
    }
}
