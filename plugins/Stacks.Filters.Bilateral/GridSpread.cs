using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// Spreads samples to the grid's nodes: node n gets sum_q b_n(q) g_l(q) c_q on every level l, b the spline and g the
/// level's weight, and the same times v_q less the level's value. A tile's crowd shares sixteen levels, and its sums stay
/// in registers along a row; the others go to their nodes one by one.
/// </summary>
internal sealed class GridSpread<T, TForm, TLanes>(LevelFrame<T> frame, Plane<float> factors)
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
    where TForm : struct, IPassForm
    where TLanes : struct, ILevelLanes<TLanes>
{
    private const int Lanes = LevelWeights.Lanes;
    private const int Support = SpatialGrid.Support;
    private const int LonerBits = 16;

    private readonly SpatialGrid grid = frame.Grid;
    private readonly LevelWeights weights = frame.Weights;
    private readonly GuideLevels guide = frame.Guide;
    private readonly LevelSlots slots = frame.Slots;
    private readonly TileCrowds crowds = frame.Crowds;
    private readonly GridNodes nodes = frame.Nodes;
    private readonly Plane<T> values = frame.Values;

    /// <summary>Adds a tile's samples to its nodes.</summary>
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

        Span<float> sums = stackalloc float[Support * Support * 2 * Lanes];
        sums.Clear();
        TLanes offsets = TForm.Values && slot >= 0 ? slots.Sixteen<TLanes>(slot, origin) : TLanes.All(0);
        ref float spline = ref MemoryMarshal.GetArrayDataReference(grid.Spline);

        for (int y = 0; y < rows; y++)
        {
            int start = ((tile.Top + y) * grid.Width) + tile.Left;
            ref int samples = ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(guide.Samples.Buffer), start);
            ref T v = ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(values.Buffer), start);
            ref float c = ref TForm.Factors ? ref factors.Buffer[start] : ref spline;
            TLanes w0 = TLanes.All(0), w1 = w0, w2 = w0, w3 = w0, e0 = w0, e1 = w0, e2 = w0, e3 = w0;
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
                if (TForm.Factors)
                    weight *= TLanes.All(Unsafe.Add(ref c, x));
                ref float b = ref Unsafe.Add(ref spline, Support * x);
                TLanes b0 = TLanes.All(b), b1 = TLanes.All(Unsafe.Add(ref b, 1)), b2 = TLanes.All(Unsafe.Add(ref b, 2)), b3 = TLanes.All(Unsafe.Add(ref b, 3));
                w0 = TLanes.MultiplyAdd(weight, b0, w0);
                w1 = TLanes.MultiplyAdd(weight, b1, w1);
                w2 = TLanes.MultiplyAdd(weight, b2, w2);
                w3 = TLanes.MultiplyAdd(weight, b3, w3);
                if (TForm.Values)
                {
                    TLanes exchange = weight * (TLanes.All(LevelSlots.From(origin, Unsafe.Add(ref v, x))) - offsets);
                    e0 = TLanes.MultiplyAdd(exchange, b0, e0);
                    e1 = TLanes.MultiplyAdd(exchange, b1, e1);
                    e2 = TLanes.MultiplyAdd(exchange, b2, e2);
                    e3 = TLanes.MultiplyAdd(exchange, b3, e3);
                }
            }

            ref float to = ref sums[0];
            for (int j = 0; j < Support; j++)
            {
                TLanes b = TLanes.All(Unsafe.Add(ref spline, (Support * y) + j));
                int at = j * Support * 2 * Lanes;
                TLanes.MultiplyAdd(w0, b, TLanes.Load(ref to, at)).Store(ref to, at);
                TLanes.MultiplyAdd(w1, b, TLanes.Load(ref to, at + (2 * Lanes))).Store(ref to, at + (2 * Lanes));
                TLanes.MultiplyAdd(w2, b, TLanes.Load(ref to, at + (4 * Lanes))).Store(ref to, at + (4 * Lanes));
                TLanes.MultiplyAdd(w3, b, TLanes.Load(ref to, at + (6 * Lanes))).Store(ref to, at + (6 * Lanes));
                if (TForm.Values)
                {
                    TLanes.MultiplyAdd(e0, b, TLanes.Load(ref to, at + Lanes)).Store(ref to, at + Lanes);
                    TLanes.MultiplyAdd(e1, b, TLanes.Load(ref to, at + (3 * Lanes))).Store(ref to, at + (3 * Lanes));
                    TLanes.MultiplyAdd(e2, b, TLanes.Load(ref to, at + (5 * Lanes))).Store(ref to, at + (5 * Lanes));
                    TLanes.MultiplyAdd(e3, b, TLanes.Load(ref to, at + (7 * Lanes))).Store(ref to, at + (7 * Lanes));
                }
            }
        }

        if (slot >= 0)
        {
            TLanes one = TLanes.All(1);
            ref float node = ref MemoryMarshal.GetArrayDataReference(nodes.Sums.Buffer);
            for (int i = 0; i < Support * Support; i++)
            {
                nint at = nodes.Start(tileX + (i % Support), tileY + (i / Support)) + slot;
                TLanes.MultiplyAdd(TLanes.Load(ref sums[0], i * 2 * Lanes), one, TLanes.Load(ref node, at)).Store(ref node, at);
                if (TForm.Values)
                {
                    at += nodes.Slots;
                    TLanes.MultiplyAdd(TLanes.Load(ref sums[0], (i * 2 * Lanes) + Lanes), one, TLanes.Load(ref node, at)).Store(ref node, at);
                }
            }
        }

        for (int i = 0; i < alone; i++)
            SpreadLoner(tileX, tileY, loners[i] & ((1 << LonerBits) - 1), loners[i] >> LonerBits);
    }

    /// <summary>A sample apart from its tile's crowd goes to its nodes by itself.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private void SpreadLoner(int tileX, int tileY, int x, int y)
    {
        int at = (((tileY * grid.Pitch) + y) * grid.Width) + (tileX * grid.Pitch) + x;
        int sample = guide.Samples.Buffer[at];
        int slot = slots.SixteenAt(sample >> LevelWeights.FractionBits);
        if (slot < 0)
            return;
        TLanes weight = weights.Of<TLanes>(sample), exchange = weight;
        if (TForm.Factors)
            weight *= TLanes.All(factors.Buffer[at]);
        if (TForm.Values)
            exchange = weight * (TLanes.All(LevelSlots.From(slots.Value(slot), values.Buffer[at])) - slots.Sixteen<TLanes>(slot, slots.Value(slot)));
        ref float spline = ref MemoryMarshal.GetArrayDataReference(grid.Spline);
        ref float row = ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(nodes.Sums.Buffer), nodes.Start(tileX, tileY) + slot);
        nint nextX = nodes.Stride, nextY = (nint)grid.NodesX * nodes.Stride, toValues = nodes.Slots;
        for (int j = 0; j < Support; j++, row = ref Unsafe.Add(ref row, nextY))
        {
            TLanes alongY = TLanes.All(Unsafe.Add(ref spline, (Support * y) + j)), w = weight * alongY, e = exchange * alongY;
            for (int i = 0; i < Support; i++)
            {
                TLanes alongX = TLanes.All(Unsafe.Add(ref spline, (Support * x) + i));
                TLanes.MultiplyAdd(w, alongX, TLanes.Load(ref row, i * nextX)).Store(ref row, i * nextX);
                if (TForm.Values)
                    TLanes.MultiplyAdd(e, alongX, TLanes.Load(ref row, (i * nextX) + toValues)).Store(ref row, (i * nextX) + toValues);
            }
        }
    }
}
