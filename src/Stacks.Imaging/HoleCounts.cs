using System.Numerics;
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
    private readonly byte[] columns, holes;
    private readonly ushort[] counts;
    private int next;

    /// <summary>Memory for blocks of so many columns.</summary>
    public HoleCounts(int block, int side, IScratch scratch)
    {
        ArgumentOutOfRangeException.ThrowIfGreaterThan(side, 15);
        this.block = block;
        this.side = side;
        columns = scratch.Rent<byte>(ColumnCount(block, side), 1).Buffer;
        holes = scratch.Rent<byte>(2 * RowLength(block), 1).Buffer;
        counts = scratch.Rent<ushort>(2 * block, 1).Buffer;
    }

    /// <summary>Bytes rented.</summary>
    public static long ScratchBytes(int block, int side) => ColumnCount(block, side) + (2 * RowLength(block)) + (4L * block);

    /// <summary>Begins above row <paramref name="y"/>, at block column <paramref name="x"/>.</summary>
    public void Start<T>(ReflectedRows<T> rows, int x, int y)
        where T : unmanaged, INumber<T>
    {
        columns.AsSpan(0, ColumnCount(block, side)).Clear();
        for (int row = y - (side / 2); row < y + (side / 2); row++)
            Add(rows.Outsiders(row), x + rows.Radius - (side / 2));
        next = y;
    }

    /// <summary>Counts the windows around two rows, which follow those counted before.</summary>
    /// <returns>True when any window has a hole.</returns>
    public bool Count<T>(ReflectedRows<T> rows, int x, int y, int width)
        where T : unmanaged, INumber<T>
    {
        ArgumentOutOfRangeException.ThrowIfNotEqual(y, next);
        int left = x + rows.Radius - (side / 2);
        bool any = false;
        for (int row = 0; row < 2; row++, next++)
        {
            Add(rows.Outsiders(next + (side / 2)), left);
            any |= Sum(holes.AsSpan(row * RowLength(block), RowLength(block)));
            Subtract(rows.Outsiders(next - (side / 2)), left);
        }

        Span<ushort> all = counts.AsSpan(0, 2 * block);
        if (!any)
        {
            all.Fill((ushort)(side * side));
            return false;
        }

        for (int row = 0; row < 2; row++)
        {
            ReadOnlySpan<byte> found = Holes(row);
            for (int i = 0; i < width; i++)
                all[(row * block) + i] = (ushort)((side * side) - found[i]);
        }

        return true;
    }

    /// <summary>Holes of the windows of a row.</summary>
    public ReadOnlySpan<byte> Holes(int row) => holes.AsSpan(row * RowLength(block), block);

    /// <summary>Samples that take part in the windows of a row.</summary>
    public ReadOnlySpan<ushort> Counts(int row) => counts.AsSpan(row * block, block);

    /// <summary>True when windows in columns [x, x + count) of either row have holes.</summary>
    public bool AnyIn(int x, int count) =>
        Holes(0).Slice(x, count).ContainsAnyExcept((byte)0) || Holes(1).Slice(x, count).ContainsAnyExcept((byte)0);

    private static int RowLength(int block) => Math.Max(block, Vector512<byte>.Count);

    private static int ColumnCount(int block, int side) => RowLength(block) + side - 1;

    private void Add(ReadOnlySpan<byte> outsiders, int left)
    {
        ReadOnlySpan<byte> row = outsiders[left..Math.Min(left + ColumnCount(block, side), outsiders.Length)];
        int i = 0;
        for (; i <= row.Length - Vector512<byte>.Count; i += Vector512<byte>.Count)
            (Vector512.Create<byte>(columns.AsSpan(i)) + Vector512.Create(row[i..])).CopyTo(columns.AsSpan(i));
        for (; i < row.Length; i++)
            columns[i] += row[i];
    }

    private void Subtract(ReadOnlySpan<byte> outsiders, int left)
    {
        ReadOnlySpan<byte> row = outsiders[left..Math.Min(left + ColumnCount(block, side), outsiders.Length)];
        int i = 0;
        for (; i <= row.Length - Vector512<byte>.Count; i += Vector512<byte>.Count)
            (Vector512.Create<byte>(columns.AsSpan(i)) - Vector512.Create(row[i..])).CopyTo(columns.AsSpan(i));
        for (; i < row.Length; i++)
            columns[i] -= row[i];
    }

    private bool Sum(Span<byte> into)
    {
        Vector512<byte> any = Vector512<byte>.Zero;
        for (int x = 0; x <= into.Length - Vector512<byte>.Count; x += Vector512<byte>.Count)
        {
            Vector512<byte> sum = Vector512<byte>.Zero;
            for (int column = 0; column < side; column++)
                sum += Vector512.Create<byte>(columns.AsSpan(x + column));
            sum.CopyTo(into[x..]);
            any |= sum;
        }

        return any != Vector512<byte>.Zero;
    }
}
