using System.Numerics;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>What a pass sums: its kernels are compiled for each.</summary>
internal interface IPassForm
{
    /// <summary>Whether a neighbour's weight carries its factor c_q; otherwise c_q = 1.</summary>
    static abstract bool Factors { get; }

    /// <summary>Whether sum w_pq c_q (v_q - v_p) is wanted beside sum w_pq c_q.</summary>
    static abstract bool Values { get; }
}

/// <summary>A frame on range levels and a coarse grid, ready for applications of w.</summary>
internal sealed class LevelFrame<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private readonly ThinLevels<T> thin;
    private readonly Plane<float> sums;

    /// <summary>Sorts a frame's samples.</summary>
    /// <param name="grid">Nodes.</param>
    /// <param name="weights">Levels.</param>
    /// <param name="guide">T, filled.</param>
    /// <param name="slots">Which levels the grid holds.</param>
    /// <param name="values">v.</param>
    /// <param name="context">Bands and scratch.</param>
    public LevelFrame(SpatialGrid grid, LevelWeights weights, GuideLevels guide, LevelSlots slots, Plane<T> values, FrameContext context)
    {
        (Grid, Weights, Guide, Slots, Values) = (grid, weights, guide, slots, values);
        IScratch scratch = context.Scratch;
        Crowds = new TileCrowds(grid, scratch);
        Crowds.Find(guide, weights.Room, context.Bands);
        Nodes = new GridNodes(grid, weights.Norm, scratch);
        thin = new ThinLevels<T>(this, scratch);
        sums = scratch.Rent<float>(grid.Width, grid.Height);
        Exchanges = scratch.Rent<float>(grid.Width, grid.Height);
    }

    /// <summary>Places in space.</summary>
    public SpatialGrid Grid { get; }

    /// <summary>Weights on levels.</summary>
    public LevelWeights Weights { get; }

    /// <summary>T.</summary>
    public GuideLevels Guide { get; }

    /// <summary>v.</summary>
    public Plane<T> Values { get; }

    /// <summary>Which levels the grid holds.</summary>
    public LevelSlots Slots { get; }

    /// <summary>Which levels a tile's samples share.</summary>
    public TileCrowds Crowds { get; }

    /// <summary>Sums on the grid.</summary>
    public GridNodes Nodes { get; }

    /// <summary>sum_q w_pq c_q (v_q - v_p) of the last application that took values.</summary>
    public Plane<float> Exchanges { get; }

    /// <summary>Bytes of all this, guide, slots and values apart.</summary>
    public static long Bytes(SpatialGrid grid) =>
        TileCrowds.Bytes(grid) + GridNodes.Bytes(grid) + ThinLevels<T>.Bytes(grid)
        + (2L * sizeof(float) * grid.Width * grid.Height);

    /// <summary>
    /// One application of w: sum_q w_pq c_q and sum_q w_pq c_q (v_q - v_p), handed row by row to
    /// <paramref name="finish"/>. Tiles of every fourth row of tiles share no nodes and are spread at the same time, so
    /// that the order of sums, and with it every bit, is the same for any number of bands.
    /// </summary>
    public void Apply<TForm, TLanes>(Plane<float> factors, FrameContext context, RowSums finish)
        where TForm : struct, IPassForm
        where TLanes : struct, ILevelLanes<TLanes>
    {
        const int apart = SpatialGrid.Support;
        thin.Sum<TForm>(factors, sums, Exchanges, context);
        GridSpread<T, TForm, TLanes> spread = new(this, factors);
        GridGather<T, TForm, TLanes> gather = new(this, sums, Exchanges);
        for (Slots.Restart(); Slots.NextBatch();)
        {
            Nodes.Clear(Slots.Count, TForm.Values);
            for (int turn = 0; turn < apart; turn++)
            {
                int offset = turn;
                ForEachTileRow((Grid.TilesY + apart - 1 - offset) / apart, context, (row, loners) =>
                {
                    for (int tile = 0; tile < Grid.TilesX; tile++)
                        spread.Tile(tile, offset + (apart * row), loners);
                });
            }

            Nodes.Blur<TLanes>(Slots.Busy.Buffer, context);
            ForEachTileRow(Grid.TilesY, context, (row, loners) =>
            {
                for (int tile = 0; tile < Grid.TilesX; tile++)
                    gather.Tile(tile, row, loners);
            });
        }

        context.Bands.ForEach(Grid.Height, (first, end) =>
        {
            for (int y = first; y < end; y++)
                finish(y, sums.Row(y), Exchanges.Row(y));
        });
    }

    private void ForEachTileRow(int rows, FrameContext context, Action<int, int[]> work) => context.Bands.ForEach(rows, (first, end) =>
    {
        int[] loners = context.Scratch.Rent<int>(Grid.Pitch, Grid.Pitch).Buffer;
        for (int row = first; row < end; row++)
        {
            context.Cancellation.ThrowIfCancellationRequested();
            work(row, loners);
        }
    });
}

/// <summary>Receives a row's sum_q w_pq c_q and, in passes that take them, sum_q w_pq c_q (v_q - v_p).</summary>
internal delegate void RowSums(int y, ReadOnlySpan<float> weights, ReadOnlySpan<float> exchanges);
