namespace Stacks.Abstractions;

/// <summary>
/// One 2-D image, width x height samples, row-major, <c>x</c> fastest, first row as stored, rows without gaps.
/// The buffer may be longer than the plane (pools hand out what they have). A view: copying it copies no samples.
/// </summary>
/// <typeparam name="T">Sample type.</typeparam>
public readonly struct Plane<T>
    where T : unmanaged
{
    /// <summary>A view on the first <paramref name="width"/> x <paramref name="height"/> samples of a buffer.</summary>
    /// <exception cref="ArgumentOutOfRangeException">A side is below 1, or the buffer is too short.</exception>
    public Plane(T[] buffer, int width, int height)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(width, 1);
        ArgumentOutOfRangeException.ThrowIfLessThan(height, 1);
        ArgumentOutOfRangeException.ThrowIfLessThan((long)buffer.Length, (long)width * height, nameof(buffer));
        Buffer = buffer;
        Width = width;
        Height = height;
    }

    /// <summary>The samples; those beyond width x height are not part of the plane.</summary>
    public T[] Buffer { get; }

    /// <summary>Samples in a row.</summary>
    public int Width { get; }

    /// <summary>Rows.</summary>
    public int Height { get; }

    /// <summary>width * height.</summary>
    public int Length => Width * Height;

    /// <summary>All samples, row after row.</summary>
    public Span<T> Samples => Buffer.AsSpan(0, Length);

    /// <summary>The sample at column <paramref name="x"/> of row <paramref name="y"/>.</summary>
    public ref T this[int x, int y] => ref Buffer[(y * Width) + x];

    /// <summary>Row <paramref name="y"/>, <see cref="Width"/> samples.</summary>
    public Span<T> Row(int y) => Buffer.AsSpan(y * Width, Width);
}
