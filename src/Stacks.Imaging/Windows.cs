using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>Makes <see cref="Windows{T}"/>.</summary>
public static class Windows
{
    /// <summary>Bytes that one plane with its border rents at most.</summary>
    public static long ScratchBytes<T>(int width, int height, int radius)
        where T : unmanaged =>
        ((long)width + (2 * radius)) * ((long)height + (2 * radius)) * Unsafe.SizeOf<T>();

    /// <summary>Makes a bordered plane of samples that are computed row by row.</summary>
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
        return new Windows<T>(samples, radius);
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
/// All windows of a plane: its samples with a reflected border (see <see cref="Reflection"/>). Kernels then know no
/// borders: the window around (x, y) is a plain block.
/// </summary>
/// <typeparam name="T">ushort, short, float or double.</typeparam>
public readonly struct Windows<T>
    where T : unmanaged, INumber<T>
{
    private readonly Plane<T> samples;
    private readonly int radius;

    internal Windows(Plane<T> samples, int radius)
    {
        this.samples = samples;
        this.radius = radius;
    }

    /// <summary>Samples from one row to the next in <see cref="From"/>.</summary>
    public int Stride => samples.Width;

    /// <summary>The samples from (x, y) on, border included: <c>x</c>, <c>y</c> from minus the radius; rows are <see cref="Stride"/> apart.</summary>
    public ReadOnlySpan<T> From(int x, int y)
    {
        int start = ((y + radius) * Stride) + x + radius;
        return samples.Buffer.AsSpan(start, samples.Length - start);
    }
}
