using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// Sub-lattices of a colour-filter mosaic: sample (x, y) of the one at offset (ox, oy) is sample
/// (ox + x * periodX, oy + y * periodY) of the frame.
/// </summary>
internal static class Mosaic
{
    /// <summary>Samples of one axis that belong to an offset: ceil((length - offset) / period).</summary>
    public static int Share(int length, int period, int offset) => (length - offset + period - 1) / period;

    /// <summary>Copies one sub-lattice out of a frame.</summary>
    public static void Split<T>(Plane<T> whole, Lattice lattice, int offsetX, int offsetY, Plane<T> part)
        where T : unmanaged
    {
        for (int y = 0; y < part.Height; y++)
        {
            ReadOnlySpan<T> from = whole.Row(offsetY + (y * lattice.PeriodY))[offsetX..];
            Span<T> to = part.Row(y);
            for (int x = 0; x < to.Length; x++)
                to[x] = from[x * lattice.PeriodX];
        }
    }

    /// <summary>Copies one sub-lattice back to its places.</summary>
    public static void Join<T>(Plane<T> part, Lattice lattice, int offsetX, int offsetY, Plane<T> whole)
        where T : unmanaged
    {
        for (int y = 0; y < part.Height; y++)
        {
            ReadOnlySpan<T> from = part.Row(y);
            Span<T> to = whole.Row(offsetY + (y * lattice.PeriodY))[offsetX..];
            for (int x = 0; x < from.Length; x++)
                to[x * lattice.PeriodX] = from[x];
        }
    }
}
