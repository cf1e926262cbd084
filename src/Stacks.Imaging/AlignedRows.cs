using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>
/// Rows of doubles that start at lines of the processor's memory: a vector that lies across two lines costs twice.
/// Should the collector move the buffer, only that is lost.
/// </summary>
internal readonly struct AlignedRows
{
    private const int Line = 64 / sizeof(double);

    private readonly double[] buffer;
    private readonly int start;
    private readonly int width;

    /// <summary>Rents rows.</summary>
    /// <param name="width">Numbers in a row; a multiple of 8.</param>
    /// <param name="count">Rows.</param>
    /// <param name="scratch">Gives the memory.</param>
    public unsafe AlignedRows(int width, int count, IScratch scratch)
    {
        this.width = width;
        buffer = scratch.Rent<double>(checked((width * count) + Line), 1).Buffer;
        start = (int)(-(nint)Unsafe.AsPointer(ref buffer[0]) & 63) / sizeof(double);
    }

    /// <summary>Bytes that are rented.</summary>
    public static long ScratchBytes(int width, int count) => sizeof(double) * (((long)width * count) + Line);

    /// <summary>A row.</summary>
    public Span<double> this[int row] => buffer.AsSpan(start + (row * width), width);

    /// <summary>First number of the first row.</summary>
    public ref double First => ref buffer[start];

    /// <summary>Makes all rows 0.</summary>
    public void Clear() => Array.Clear(buffer);
}
