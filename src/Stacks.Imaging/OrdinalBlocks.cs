using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>
/// Quantiles of large windows, in a time that hardly depends on the window: along a row of an <see cref="OrdinalTile{T}"/>
/// the samples below the last answer are counted again from the column that leaves and the one that enters (Huang, Yang and
/// Tang, IEEE Trans. Acoustics, Speech and Signal Processing 27 (1979) 13, with ordinals for the histogram); then the
/// samples around are walked in their order from there until the rank is met. Tiles are large, since sorting them costs
/// their border too; the walk goes over the samples of a small part, since those outside of the window are in its way. A
/// block is a row of a part.
/// </summary>
internal sealed class OrdinalBlocks<T> : QuantileBlocks<T>
    where T : unmanaged, INumber<T>
{
    private readonly WindowQuantiles quantiles;
    private readonly ReflectedRows<T> rows;
    private readonly int end, side, radius, tileSide, partSide;
    private readonly OrdinalTile<T> tile;
    private readonly (int Rank, double Fraction)[] targets;
    private readonly int[] indices, below, starts;
    private readonly T[] values;
    private readonly ushort[] counts;
    private int tileX, tileY, tileWidth, tileHeight, partX, partY, partHeight;

    public OrdinalBlocks(WindowQuantiles quantiles, ReflectedRows<T> rows, int first, int end, IScratch scratch)
    {
        this.quantiles = quantiles;
        this.rows = rows;
        this.end = end;
        side = quantiles.Side;
        radius = side / 2;
        tileSide = OrdinalBlocks.TileSide(side);
        partSide = OrdinalBlocks.PartSide(side);
        tile = new OrdinalTile<T>(scratch);
        int probabilities = quantiles.Probabilities.Length;
        targets = new (int, double)[probabilities];
        indices = new int[probabilities];
        below = new int[probabilities];
        starts = new int[probabilities];
        values = scratch.Rent<T>(partSide, probabilities).Buffer;
        counts = scratch.Rent<ushort>(partSide, 1).Buffer;
        Height = 1;

        // As if the last part of a tile left of the first were done.
        tileX = -tileSide;
        tileY = first;
        Y = first - 1;
    }

    /// <inheritdoc/>
    public override bool Advance()
    {
        if (++Y >= tileY + partY + partHeight && !NextPart())
            return false;
        Row(Y - tileY);
        return true;
    }

    /// <inheritdoc/>
    public override ReadOnlySpan<T> Values(int probability, int row) => values.AsSpan(probability * partSide, Width);

    /// <inheritdoc/>
    public override ReadOnlySpan<ushort> Counts(int row) => counts.AsSpan(0, Width);

    private bool NextPart()
    {
        partX += partSide;
        if (partX >= tileWidth)
        {
            partX = 0;
            partY += partSide;
        }

        if (partY >= tileHeight && !NextTile())
            return false;
        X = tileX + partX;
        Y = tileY + partY;
        Width = Math.Min(partSide, tileWidth - partX);
        partHeight = Math.Min(partSide, tileHeight - partY);
        tile.Select(partX, partY, Width + side - 1, partHeight + side - 1);
        starts.AsSpan().Fill(tile.PartCount / 2);
        return true;
    }

    private bool NextTile()
    {
        tileX += tileSide;
        if (tileX >= rows.Width)
        {
            tileX = 0;
            tileY += tileSide;
        }

        if (tileY >= end)
            return false;
        partX = 0;
        partY = 0;
        tileWidth = Math.Min(tileSide, rows.Width - tileX);
        tileHeight = Math.Min(tileSide, end - tileY);
        tile.Fill(rows, tileX - radius, tileY - radius, tileWidth + side - 1, tileHeight + side - 1);
        return true;
    }

    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    private unsafe void Row(int y)
    {
        bool all = rows.AllTakePart;
        fixed (ushort* ordinals = &tile.Ordinals[(partX << 8) | y], places = &tile.Places[OrdinalTile<T>.Padding])
        fixed (ushort* inOrder = &tile.PartOrdinals[OrdinalTile<T>.Padding])
        {
            WindowOrdinals window = new(ordinals, places, side);
            int taking = all ? side * side : window.CountBelow(OrdinalTile<T>.None);
            SetTargets(taking);
            for (int p = 0; p < indices.Length; p++)
            {
                indices[p] = starts[p];
                below[p] = window.CountBelow(inOrder[starts[p]]);
            }

            for (int x = 0; x < Width; x++)
            {
                if (x > 0 && !all && window.Change(x, OrdinalTile<T>.None) is int change and not 0)
                {
                    taking += change;
                    SetTargets(taking);
                }

                counts[x] = (ushort)taking;
                Vector512<byte> corner = Vector512.Create((ushort)(((partX + x) << 8) | y)).AsByte();
                for (int p = 0; p < targets.Length; p++)
                {
                    int index = indices[p], under = below[p] + (x > 0 ? window.Change(x, inOrder[index]) : 0);
                    if (taking == 0)
                    {
                        below[p] = under;
                        continue;
                    }

                    (int rank, double fraction) = targets[p];
                    index = window.Seek(corner, index, rank - 1 - under);
                    indices[p] = index;
                    below[p] = rank - 1;
                    T value = tile.Sample(inOrder[index]);
                    if (fraction > 0)
                        value = Quantile.Between(value, tile.Sample(inOrder[window.Seek(corner, index + 1, 0)]), fraction);
                    values[(p * partSide) + x] = value;
                }

                if (x == 0)
                    indices.CopyTo(starts, 0);
            }
        }
    }

    private void SetTargets(int taking)
    {
        for (int p = 0; p < targets.Length && taking > 0; p++)
            targets[p] = Quantile.Position(taking, quantiles.Probabilities[p]);
    }
}

/// <summary>Sizes that <see cref="OrdinalBlocks{T}"/> works with.</summary>
internal static class OrdinalBlocks
{
    /// <summary>The largest window: a tile of some columns has to hold it.</summary>
    public const int MostSide = 223;

    /// <summary>Results of a tile along x and y.</summary>
    public static int TileSide(int side) => Math.Min(192, 254 - (side - 1));

    /// <summary>Results of a part of a tile along x and y.</summary>
    public static int PartSide(int side) => Math.Min(Math.Clamp(side * 3 / 2, 24, 64), TileSide(side));

    /// <summary>Bytes rented for windows of one kind.</summary>
    public static long ScratchBytes<T>(WindowQuantiles quantiles)
        where T : unmanaged, INumber<T> =>
        OrdinalTile<T>.ScratchBytes + ((long)PartSide(quantiles.Side) * ((quantiles.Probabilities.Length * Unsafe.SizeOf<T>()) + sizeof(ushort)));
}
