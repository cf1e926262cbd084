using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The nodes of a <see cref="SpatialGrid"/>: for each, a sum of weights on every slot and, in passes that take them, a sum
/// of weighted values on every slot behind these.
/// </summary>
/// <param name="grid">Nodes.</param>
/// <param name="norm">Factor of all weights.</param>
/// <param name="scratch">Scratch.</param>
internal sealed class GridNodes(SpatialGrid grid, double norm, IScratch scratch)
{
    private const int Strip = 4 * LevelWeights.Lanes;

    private readonly float[] taps = [.. grid.Blur.Select(tap => (float)(tap * Math.Sqrt(norm)))];

    /// <summary>Row after row of nodes.</summary>
    public Plane<float> Sums { get; } = scratch.Rent<float>(grid.NodesX * grid.MostSlots * 2, grid.NodesY);

    /// <summary>Slots of a node now.</summary>
    public int Slots { get; private set; }

    /// <summary>Sums of a node: <see cref="Slots"/>, or twice as many, the weighted values behind the weights.</summary>
    public int Stride { get; private set; }

    /// <summary>Bytes of all this on one band.</summary>
    public static long Bytes(SpatialGrid grid) =>
        sizeof(float) * ((2L * grid.NodesX * grid.NodesY * grid.MostSlots) + ((long)Strip * (grid.NodesX + grid.NodesY + (4 * grid.Blur.Length))));

    /// <summary>Where the sums of a node begin.</summary>
    public nint Start(int x, int y) => (((nint)y * grid.NodesX) + x) * Stride;

    /// <summary>Sets so many slots of every node to 0.</summary>
    public void Clear(int slots, bool withValues)
    {
        Slots = slots;
        Stride = withValues ? 2 * slots : slots;
        Sums.Buffer.AsSpan(0, checked((int)Start(0, grid.NodesY))).Clear();
    }

    /// <summary>Sums along x, then along y, of neighbouring nodes times the blur; idle slots become 0.</summary>
    public void Blur<TLanes>(ReadOnlyMemory<float> busy, FrameContext context)
        where TLanes : struct, ILevelLanes<TLanes>
    {
        context.Bands.ForEach(grid.NodesY, (first, end) =>
        {
            Plane<float> line = scratch.Rent<float>(Strip, grid.NodesX + (2 * taps.Length));
            for (int y = first; y < end; y++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                Row(y, busy.Span);
                BlurLines<TLanes>(line, grid.NodesX, Start(0, y), Stride, 0, Stride);
            }
        });
        context.Bands.ForEach(grid.NodesX, (first, end) =>
        {
            Plane<float> line = scratch.Rent<float>(Strip, grid.NodesY + (2 * taps.Length));
            BlurLines<TLanes>(line, grid.NodesY, 0, (nint)grid.NodesX * Stride, first * Stride, end * Stride);
        });
    }

    private void Row(int y, ReadOnlySpan<float> busy)
    {
        Span<float> row = Sums.Buffer.AsSpan(checked((int)Start(0, y)), grid.NodesX * Stride);
        for (int node = 0; node < row.Length; node += Slots)
        {
            for (int slot = 0; slot < Slots; slot++)
            {
                if (busy[slot] == 0)
                    row[node + slot] = 0;
            }
        }
    }

    /// <summary>Blurs along lines of nodes that are <paramref name="step"/> apart, for sums [first, end) of a node, a strip at a time.</summary>
    private void BlurLines<TLanes>(Plane<float> line, int nodes, nint start, nint step, int first, int end)
        where TLanes : struct, ILevelLanes<TLanes>
    {
        int margin = taps.Length;
        line.Samples.Clear();
        for (int from = first; from < end; from += Strip)
        {
            int count = Math.Min(Strip, end - from);
            for (int node = 0; node < nodes; node++)
            {
                Sums.Buffer.AsSpan((int)(start + (node * step) + from), count).CopyTo(line.Row(node + margin));
            }

            for (int node = 0; node < nodes; node++)
            {
                ref float target = ref Sums.Buffer[(int)(start + (node * step) + from)];
                ref float middle = ref line.Row(node + margin)[0];
                if (count == Strip)
                {
                    BlurStrip<TLanes>(ref middle, ref target);
                    continue;
                }

                for (int part = 0; part < count; part += LevelWeights.Lanes)
                    BlurAt<TLanes>(ref Unsafe.Add(ref middle, part)).Store(ref target, part);
            }
        }
    }

    /// <summary>Four vectors at once, which share the taps.</summary>
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private void BlurStrip<TLanes>(ref float middle, ref float target)
        where TLanes : struct, ILevelLanes<TLanes>
    {
        const int second = LevelWeights.Lanes, third = 2 * second, fourth = 3 * second;
        TLanes tap = TLanes.All(taps[0]);
        TLanes a = TLanes.Load(ref middle, 0) * tap, b = TLanes.Load(ref middle, second) * tap;
        TLanes c = TLanes.Load(ref middle, third) * tap, d = TLanes.Load(ref middle, fourth) * tap;
        for (int n = 1; n < taps.Length; n++)
        {
            tap = TLanes.All(taps[n]);
            nint before = -n * Strip, after = n * Strip;
            a = TLanes.MultiplyAdd(TLanes.Load(ref middle, before), tap, a);
            b = TLanes.MultiplyAdd(TLanes.Load(ref middle, before + second), tap, b);
            c = TLanes.MultiplyAdd(TLanes.Load(ref middle, before + third), tap, c);
            d = TLanes.MultiplyAdd(TLanes.Load(ref middle, before + fourth), tap, d);
            a = TLanes.MultiplyAdd(TLanes.Load(ref middle, after), tap, a);
            b = TLanes.MultiplyAdd(TLanes.Load(ref middle, after + second), tap, b);
            c = TLanes.MultiplyAdd(TLanes.Load(ref middle, after + third), tap, c);
            d = TLanes.MultiplyAdd(TLanes.Load(ref middle, after + fourth), tap, d);
        }

        a.Store(ref target, 0);
        b.Store(ref target, second);
        c.Store(ref target, third);
        d.Store(ref target, fourth);
    }

    private TLanes BlurAt<TLanes>(ref float middle)
        where TLanes : struct, ILevelLanes<TLanes>
    {
        TLanes sum = TLanes.Load(ref middle, 0) * TLanes.All(taps[0]);
        for (int n = 1; n < taps.Length; n++)
        {
            TLanes tap = TLanes.All(taps[n]);
            sum = TLanes.MultiplyAdd(TLanes.Load(ref middle, -n * Strip), tap, sum);
            sum = TLanes.MultiplyAdd(TLanes.Load(ref middle, n * Strip), tap, sum);
        }

        return sum;
    }
}
