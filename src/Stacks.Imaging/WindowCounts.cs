using System.Numerics;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>
/// The samples that take no part, in the region of one tile after the other, and how many are left for each window: as
/// long as there are few, they cost little. The region is 2k - 1 rows of so many columns; <see cref="Counts"/> and
/// <see cref="Inverses"/> are of one row of windows, whose left column is x.
/// </summary>
internal readonly struct WindowCounts
{
    private const int Eight = sizeof(ulong);

    private readonly int side;
    private readonly SampleFlags without;

    /// <summary>Columns of the samples that take no part, row after row of the region; those of row j from starts[j] to starts[j + 1].</summary>
    private readonly Plane<ushort> places;
    private readonly Plane<int> starts;

    /// <summary>Row j: how many samples of row j from column x to x + k - 1 take no part; the last row: of the window.</summary>
    private readonly Plane<ushort> outsiders;

    private readonly AlignedRows rows;

    /// <summary>Rents the memory.</summary>
    /// <param name="side">k.</param>
    /// <param name="width">Columns of the region.</param>
    /// <param name="without">Flags of samples that take no part; none where no sample has one.</param>
    /// <param name="scratch">Gives the memory.</param>
    public WindowCounts(int side, int width, SampleFlags without, IScratch scratch)
    {
        this.side = side;
        this.without = without;
        rows = new AlignedRows(width, 2, scratch);
        places = scratch.Rent<ushort>(width, Height(side));
        outsiders = scratch.Rent<ushort>(width, Height(side) + 1);
        starts = scratch.Rent<int>(Height(side) + 1, 1);
        starts.Samples.Clear();
        FillWith(side * side);
    }

    /// <summary>Bytes that are rented.</summary>
    public static long ScratchBytes(int side, int width) =>
        AlignedRows.ScratchBytes(width, 2) + (sizeof(ushort) * width * ((2L * Height(side)) + 1)) + (sizeof(int) * (Height(side) + 1L));

    /// <summary>n; 0 where the pixel itself takes no part.</summary>
    public Span<double> Counts => rows[0];

    /// <summary>1 / n.</summary>
    public Span<double> Inverses => rows[1];

    /// <summary>True when all samples of the region take part.</summary>
    public bool AllTakePart => starts.Buffer[Height(side)] == 0;

    /// <summary>Columns of row j of the region whose samples take no part.</summary>
    public ReadOnlySpan<ushort> OutsidersOf(int j) => places.Samples[starts.Buffer[j]..starts.Buffer[j + 1]];

    /// <summary>Looks a region up.</summary>
    /// <param name="flags">Flags of the plane.</param>
    /// <param name="x">First column of the region, in the plane or in its reflection.</param>
    /// <param name="y">First row.</param>
    /// <param name="width">Columns that are looked up.</param>
    public void LookUp(Plane<SampleFlags> flags, int x, int y, int width)
    {
        if (without == 0)
            return;
        if (!AllTakePart)
            FillWith(side * side);
        Span<int> ends = starts.Samples[1..];
        int found = 0;
        for (int j = 0; j < ends.Length; j++)
        {
            ReadOnlySpan<byte> row = MemoryMarshal.AsBytes(flags.Row(Reflection.Index(y + j, flags.Height)));
            if (x >= 0 && x + width <= flags.Width)
            {
                ReadOnlySpan<byte> here = row.Slice(x, width);
                ReadOnlySpan<ulong> eights = MemoryMarshal.Cast<byte, ulong>(here);
                for (int i = 0; i < eights.Length; i++)
                {
                    if ((eights[i] & (0x0101010101010101UL * (byte)without)) != 0)
                        found = Add(here, i * Eight, Eight, found);
                }

                found = Add(here, eights.Length * Eight, width - (eights.Length * Eight), found);
            }
            else
            {
                for (int i = 0; i < width; i++)
                {
                    if ((row[Reflection.Index(x + i, flags.Width)] & (byte)without) != 0)
                        places.Samples[found++] = (ushort)i;
                }
            }

            ends[j] = found;
        }

        if (found > 0)
            Spread();
    }

    /// <summary>Counts the windows of row i of the tile, one row after the other.</summary>
    public void CountRow(int i)
    {
        if (AllTakePart)
            return;
        Span<ushort> window = outsiders.Row(Height(side));
        if (i == 0)
        {
            window.Clear();
            for (int j = 0; j < side; j++)
                Add(window, j, 1);
        }
        else
        {
            Add(window, i + side - 1, 1);
            Add(window, i - 1, ushort.MaxValue);
        }

        FillWith(side * side);
        Span<double> counts = Counts, inverses = Inverses;
        ReadOnlySpan<ulong> fours = MemoryMarshal.Cast<ushort, ulong>(window);
        for (int four = 0; four < fours.Length; four++)
        {
            if (fours[four] == 0)
                continue;
            for (int x = 4 * four; x < (4 * four) + 4; x++)
            {
                counts[x] = (side * side) - window[x];
                inverses[x] = 1 / counts[x];
            }
        }

        int radius = side / 2;
        foreach (ushort u in OutsidersOf(i + radius))
        {
            if (u >= radius && u < counts.Length - radius)
                counts[u - radius] = 0;
        }
    }

    private static int Height(int side) => (2 * side) - 1;

    private void FillWith(int count)
    {
        Counts.Fill(count);
        Inverses.Fill(1.0 / count);
    }

    private int Add(ReadOnlySpan<byte> row, int first, int length, int found)
    {
        for (int i = first; i < first + length; i++)
        {
            if ((row[i] & (byte)without) != 0)
                places.Samples[found++] = (ushort)i;
        }

        return found;
    }

    private void Spread()
    {
        for (int j = 0; j < Height(side); j++)
        {
            Span<ushort> row = outsiders.Row(j);
            if (OutsidersOf(j).IsEmpty)
                continue;
            row.Clear();
            foreach (ushort u in OutsidersOf(j))
            {
                for (int x = Math.Max(0, u - side + 1); x <= u; x++)
                    row[x]++;
            }
        }
    }

    /// <summary>window += sign * row j; whole numbers modulo 2^16, so that 65535 takes away.</summary>
    private void Add(Span<ushort> window, int j, ushort sign)
    {
        if (OutsidersOf(j).IsEmpty)
            return;
        ReadOnlySpan<Vector<ushort>> row = MemoryMarshal.Cast<ushort, Vector<ushort>>(outsiders.Row(j));
        Span<Vector<ushort>> sums = MemoryMarshal.Cast<ushort, Vector<ushort>>(window);
        for (int i = 0; i < sums.Length; i++)
            sums[i] += sign * row[i];
    }
}
