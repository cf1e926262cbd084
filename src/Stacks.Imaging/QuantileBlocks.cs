using System.Numerics;

namespace Stacks.Imaging;

/// <summary>
/// Quantiles of the windows around all pixels of some rows, block by block: call <see cref="Advance"/>, then read. Blocks
/// cover the rows once; their order and shape depend on the kernel.
/// </summary>
/// <typeparam name="T">ushort, short, float or double.</typeparam>
public abstract class QuantileBlocks<T>
    where T : unmanaged, INumber<T>
{
    /// <summary>First column of the block.</summary>
    public int X { get; protected set; }

    /// <summary>First row of the block.</summary>
    public int Y { get; protected set; }

    /// <summary>Columns of the block.</summary>
    public int Width { get; protected set; }

    /// <summary>Rows of the block.</summary>
    public int Height { get; protected set; }

    /// <summary>Computes the next block; false when there is none left.</summary>
    public abstract bool Advance();

    /// <summary>The quantiles of one probability around the pixels of row <see cref="Y"/> + <paramref name="row"/>, one for each column.</summary>
    public abstract ReadOnlySpan<T> Values(int probability, int row);

    /// <summary>How many samples take part in each of these windows; where none does, the values are undefined.</summary>
    public abstract ReadOnlySpan<ushort> Counts(int row);
}
