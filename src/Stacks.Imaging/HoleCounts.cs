using System.Numerics;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>
/// How many samples of k x k windows take no part, for two rows of windows at a time: column sums that go down with the
/// rows, summed along x. In bytes, so k is 15 at most.
/// </summary>
internal sealed class HoleCounts
{
    private readonly int block, side;
    private readonly byte[] columns, holes, none;
    private readonly ushort[] counts;
    private int next;

    /// <summary>Memory for blocks of so many columns.</summary>
    public HoleCounts(int block, int side, IScratch scratch)
    {
        ArgumentOutOfRangeException.ThrowIfGreaterThan(side, 15);
        this.block = block;
        this.side = side;
        columns = scratch.Rent<byte>(ColumnCount(block, side), 1).Buffer;
        none = scratch.Rent<byte>(ColumnCount(block, side), 1).Buffer;
        holes = scratch.Rent<byte>(2 * RowLength(block), 1).Buffer;
        counts = scratch.Rent<ushort>(2 * RowLength(block), 1).Buffer;
    }

    /// <summary>Bytes rented.</summary>
    public static long ScratchBytes(int block, int side) => (2 * ColumnCount(block, side)) + (6L * RowLength(block));

    /// <summary>Begins above row <paramref name="y"/>, at block column <paramref name="x"/>.</summary>
    public void Start<T>(ReflectedRows<T> rows, int x, int y)
        where T : unmanaged, INumber<T>
    {
        columns.AsSpan(0, ColumnCount(block, side)).Clear();
        none.AsSpan(0, ColumnCount(block, side)).Clear();
        int left = x + rows.Radius - (side / 2);
        for (int row = y - (side / 2) - 1; row < y + (side / 2); row++)
            Slide(Part(rows.Outsiders(row), left), none);
        next = y;
    }

    /// <summary>Counts the windows around two rows, which follow those counted before.</summary>
    /// <returns>True when any window has a hole.</returns>
    public bool Count<T>(ReflectedRows<T> rows, int x, int y)
        where T : unmanaged, INumber<T>
    {
        ArgumentOutOfRangeException.ThrowIfNotEqual(y, next);
        int left = x + rows.Radius - (side / 2);
        bool any = false;
        for (int row = 0; row < 2; row++, next++)
        {
            Slide(Part(rows.Outsiders(next + (side / 2)), left), Part(rows.Outsiders(next - (side / 2) - 1), left));
            any |= Sum(holes.AsSpan(row * RowLength(block), RowLength(block)));
        }

        Span<ushort> all = counts.AsSpan(0, 2 * RowLength(block));
        if (!any)
        {
            all.Fill((ushort)(side * side));
            return false;
        }

        Vector512<ushort> full = Vector512.Create((ushort)(side * side));
        for (int row = 0; row < 2; row++)
        {
            ref byte found = ref holes[row * RowLength(block)];
            ref ushort taking = ref counts[row * RowLength(block)];
            for (nuint i = 0; i < (nuint)RowLength(block); i += (nuint)Vector512<byte>.Count)
            {
                (Vector512<ushort> low, Vector512<ushort> high) = Vector512.Widen(Vector512.LoadUnsafe(ref found, i));
                (full - low).StoreUnsafe(ref taking, i);
                (full - high).StoreUnsafe(ref taking, i + (nuint)Vector512<ushort>.Count);
            }
        }

        return true;
    }

    /// <summary>Holes of the windows of a row.</summary>
    public ReadOnlySpan<byte> Holes(int row) => holes.AsSpan(row * RowLength(block), block);

    /// <summary>Samples that take part in the windows of a row.</summary>
    public ReadOnlySpan<ushort> Counts(int row) => counts.AsSpan(row * RowLength(block), block);

    /// <summary>True when windows in columns [x, x + count) of either row have holes.</summary>
    public bool AnyIn(int x, int count) =>
        Holes(0).Slice(x, count).ContainsAnyExcept((byte)0) || Holes(1).Slice(x, count).ContainsAnyExcept((byte)0);

    private static int RowLength(int block) => (block + Vector512<byte>.Count - 1) / Vector512<byte>.Count * Vector512<byte>.Count;

    private static int ColumnCount(int block, int side) => RowLength(block) + side - 1;

    private ReadOnlySpan<byte> Part(ReadOnlySpan<byte> outsiders, int left) =>
        outsiders[left..Math.Min(left + ColumnCount(block, side), outsiders.Length)];

    /// <summary>Columns with a row that enters and without one that leaves.</summary>
    private void Slide(ReadOnlySpan<byte> entering, ReadOnlySpan<byte> leaving)
    {
        ref byte plus = ref MemoryMarshal.GetReference(entering), minus = ref MemoryMarshal.GetReference(leaving), to = ref columns[0];
        int i = 0;
        for (; i <= entering.Length - Vector512<byte>.Count; i += Vector512<byte>.Count)
        {
            nuint at = (nuint)i;
            (Vector512.LoadUnsafe(ref to, at) + Vector512.LoadUnsafe(ref plus, at) - Vector512.LoadUnsafe(ref minus, at)).StoreUnsafe(ref to, at);
        }

        for (; i < entering.Length; i++)
            columns[i] += (byte)(entering[i] - leaving[i]);
    }

    private bool Sum(Span<byte> into)
    {
        ref byte from = ref columns[0], to = ref into[0];
        Vector512<byte> any = Vector512<byte>.Zero;
        for (nuint x = 0; x < (nuint)into.Length; x += (nuint)Vector512<byte>.Count)
        {
            Vector512<byte> sum = Vector512.LoadUnsafe(ref from, x);
            for (nuint column = 1; column < (nuint)side; column++)
                sum += Vector512.LoadUnsafe(ref from, x + column);
            sum.StoreUnsafe(ref to, x);
            any |= sum;
        }

        return any != Vector512<byte>.Zero;
    }
}
