namespace Stacks.Filters.Bilateral;

/// <summary>A tile of samples and the sixteen levels that its crowd shares.</summary>
internal readonly struct CrowdTile
{
    /// <summary>A tile as a pass sees it.</summary>
    /// <param name="grid">Tiles and nodes.</param>
    /// <param name="crowds">Each tile's levels.</param>
    /// <param name="slots">Where the grid holds them.</param>
    /// <param name="weights">Weights of levels.</param>
    /// <param name="tileX">Column of the tile.</param>
    /// <param name="tileY">Row of the tile.</param>
    public CrowdTile(SpatialGrid grid, TileCrowds crowds, LevelSlots slots, LevelWeights weights, int tileX, int tileY)
    {
        int crowd = crowds.First(tileX, tileY);
        IsEmpty = crowd < 0;
        if (IsEmpty)
            return;
        Slot = slots.SixteenFrom(ref crowd);
        Crowd = crowd;
        Room = Slot < 0 ? 0 : (uint)weights.Room + 1;
        Origin = Slot < 0 ? 0 : slots.Value(Slot);
        Left = tileX * grid.Pitch;
        Top = tileY * grid.Pitch;
        Columns = Math.Min(grid.Pitch, grid.Width - Left);
        Rows = Math.Min(grid.Pitch, grid.Height - Top);
    }

    /// <summary>True when none of its samples takes part; nothing else is set then.</summary>
    public bool IsEmpty { get; }

    /// <summary>First level of the crowd.</summary>
    public int Crowd { get; }

    /// <summary>Its slot; -1 where the grid holds none of the crowd's levels.</summary>
    public int Slot { get; }

    /// <summary>First levels, from the crowd's on, of samples that belong to it: fewer than this above.</summary>
    public uint Room { get; }

    /// <summary>Value of the first level: what the crowd's values are counted from.</summary>
    public double Origin { get; }

    /// <summary>First column.</summary>
    public int Left { get; }

    /// <summary>First row.</summary>
    public int Top { get; }

    /// <summary>Columns.</summary>
    public int Columns { get; }

    /// <summary>Rows.</summary>
    public int Rows { get; }
}
