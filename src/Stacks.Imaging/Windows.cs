using System.Numerics;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>Makes <see cref="Windows{T}"/>.</summary>
public static class Windows
{
    /// <summary>Bytes that one plane with its border rents at most.</summary>
    public static long ScratchBytes<T>(int width, int height, int radius)
        where T : unmanaged =>
        ((long)width + (2 * radius)) * ((long)height + (2 * radius)) * (Unsafe.SizeOf<T>() + 1);

    /// <summary>Makes the bordered copy.</summary>
    /// <param name="plane">The samples.</param>
    /// <param name="flags">What is known of each; same shape.</param>
    /// <param name="without">Samples with any of these flags take no part in windows.</param>
    /// <param name="radius">Largest radius of a window, 1 or more.</param>
    /// <param name="scratch">Gives the memory, which lives as long as the step.</param>
    /// <param name="bands">Threads.</param>
    public static Windows<T> Of<T>(
        Plane<T> plane, Plane<SampleFlags> flags, SampleFlags without, int radius, IScratch scratch, IRowBands bands)
        where T : unmanaged, INumber<T>
    {
        int width = checked(plane.Width + (2 * radius)), height = checked(plane.Height + (2 * radius));
        Plane<T> samples = scratch.Rent<T>(width, height);
        Plane<SampleFlags>? outsiders = Any(flags.Samples, without) ? scratch.Rent<SampleFlags>(width, height) : null;
        bands.ForEach(height, (first, end) =>
        {
            for (int y = first; y < end; y++)
            {
                int source = Reflection.Index(y - radius, plane.Height);
                Span<T> inner = samples.Row(y).Slice(radius, plane.Width);
                plane.Row(source).CopyTo(inner);
                ClearNegativeZeros(inner);
                Extend(samples.Row(y), radius);
                if (outsiders is { } mask)
                {
                    Span<SampleFlags> innerFlags = mask.Row(y).Slice(radius, plane.Width);
                    ReadOnlySpan<SampleFlags> known = flags.Row(source);
                    for (int x = 0; x < known.Length; x++)
                        innerFlags[x] = known[x] & without;
                    Extend(mask.Row(y), radius);
                }
            }
        });
        return new Windows<T>(samples, outsiders, radius);
    }

    /// <summary>Makes a bordered plane of samples that are computed row by row; all of them take part.</summary>
    /// <param name="width">Samples in a row.</param>
    /// <param name="height">Rows.</param>
    /// <param name="makeRow">Computes row <c>y</c> of the plane into the span; called again for rows that the border repeats.</param>
    /// <param name="radius">Largest radius of a window, 0 or more.</param>
    /// <param name="scratch">Gives the memory, which lives as long as the step.</param>
    /// <param name="bands">Threads.</param>
    public static Windows<T> Computed<T>(int width, int height, Action<int, Span<T>> makeRow, int radius, IScratch scratch, IRowBands bands)
        where T : unmanaged, INumber<T>
    {
        Plane<T> samples = scratch.Rent<T>(checked(width + (2 * radius)), checked(height + (2 * radius)));
        bands.ForEach(samples.Height, (first, end) =>
        {
            for (int y = first; y < end; y++)
            {
                makeRow(Reflection.Index(y - radius, height), samples.Row(y).Slice(radius, width));
                Extend(samples.Row(y), radius);
            }
        });
        return new Windows<T>(samples, null, radius);
    }

    private static bool Any(ReadOnlySpan<SampleFlags> flags, SampleFlags wanted)
    {
        ReadOnlySpan<byte> bytes = MemoryMarshal.AsBytes(flags);
        ulong all = 0;
        foreach (ulong eight in MemoryMarshal.Cast<byte, ulong>(bytes))
            all |= eight;
        foreach (byte one in bytes[(bytes.Length & ~7)..])
            all |= one;
        return (all & ((byte)wanted * 0x0101010101010101UL)) != 0;
    }

    private static void ClearNegativeZeros<T>(Span<T> row)
        where T : unmanaged, INumber<T>
    {
        if (typeof(T) == typeof(ushort) || typeof(T) == typeof(short))
            return;
        for (int x = 0; x < row.Length; x++)
            row[x] += T.Zero;
    }

    private static void Extend<T>(Span<T> row, int radius)
    {
        Span<T> inner = row[radius..^radius];
        for (int i = 1; i <= radius; i++)
        {
            row[radius - i] = inner[Reflection.Index(-i, inner.Length)];
            row[radius + inner.Length - 1 + i] = inner[Reflection.Index(inner.Length - 1 + i, inner.Length)];
        }
    }
}

/// <summary>
/// All windows of a plane: its samples with a reflected border of <see cref="Radius"/> (see <see cref="Reflection"/>),
/// and beside them which samples take no part. Kernels then know no borders: the window of radius r around (x, y) is a
/// plain block. Negative zeros are stored as zeros, so that equal samples have equal bits.
/// </summary>
/// <typeparam name="T">ushort, short, float or double.</typeparam>
public readonly struct Windows<T>
    where T : unmanaged, INumber<T>
{
    private readonly Plane<T> samples;
    private readonly Plane<SampleFlags>? outsiders;

    internal Windows(Plane<T> samples, Plane<SampleFlags>? outsiders, int radius)
    {
        this.samples = samples;
        this.outsiders = outsiders;
        Radius = radius;
    }

    /// <summary>Largest radius of a window, in samples.</summary>
    public int Radius { get; }

    /// <summary>Samples in a row of the plane, without border.</summary>
    public int Width => samples.Width - (2 * Radius);

    /// <summary>Rows of the plane, without border.</summary>
    public int Height => samples.Height - (2 * Radius);

    /// <summary>Samples from one row to the next in <see cref="From"/>.</summary>
    public int Stride => samples.Width;

    /// <summary>True when every sample of the plane takes part.</summary>
    public bool AllTakePart => outsiders is null;

    /// <summary>The samples from (x, y) on, border included: <c>x</c>, <c>y</c> from -Radius; rows are <see cref="Stride"/> apart.</summary>
    public ReadOnlySpan<T> From(int x, int y)
    {
        int start = ((y + Radius) * Stride) + x + Radius;
        return samples.Buffer.AsSpan(start, samples.Length - start);
    }

    /// <summary>The sample at (x, y), border included.</summary>
    public T this[int x, int y] => samples[x + Radius, y + Radius];

    /// <summary>True when the sample at (x, y), border included, takes part.</summary>
    public bool TakesPart(int x, int y) => outsiders is not { } mask || mask[x + Radius, y + Radius] == 0;

    /// <summary>True when every sample in columns [first, end) of rows [top, bottom), border included, takes part.</summary>
    public bool AllTakePartIn(int first, int end, int top, int bottom)
    {
        if (outsiders is not { } mask)
            return true;
        for (int y = top; y < bottom; y++)
        {
            ReadOnlySpan<byte> row = MemoryMarshal.AsBytes(mask.Row(y + Radius));
            if (row[(first + Radius)..(end + Radius)].ContainsAnyExcept((byte)0))
                return false;
        }

        return true;
    }

    /// <summary>Copies the samples that take part in the window of a radius around (x, y), row after row.</summary>
    /// <returns>How many they are.</returns>
    public int Gather(int x, int y, int radius, Span<T> into)
    {
        int count = 0;
        for (int row = y - radius; row <= y + radius; row++)
        {
            for (int column = x - radius; column <= x + radius; column++)
            {
                if (TakesPart(column, row))
                    into[count++] = this[column, row];
            }
        }

        return count;
    }
}
