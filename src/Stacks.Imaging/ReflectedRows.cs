using System.Numerics;
using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>What <see cref="ReflectedRows{T}"/> needs.</summary>
public static class ReflectedRows
{
    /// <summary>Bytes that one plane rents at most.</summary>
    public static long ScratchBytes(int width, int height, int radius) => ((long)width + (2 * radius)) * height;
}

/// <summary>
/// A plane as windows see it, row by row and without a copy of the whole: reflected at its borders (see
/// <see cref="Reflection"/>), samples that take no part out of the way.
/// </summary>
/// <typeparam name="T">ushort, short, float or double.</typeparam>
public sealed class ReflectedRows<T>
    where T : unmanaged, INumber<T>
{
    private static readonly T Highest = typeof(T) == typeof(float) || typeof(T) == typeof(double)
        ? T.One / T.Zero
        : T.CreateSaturating(double.MaxValue);

    private readonly Plane<T> plane;
    private readonly Plane<byte>? outsiders;

    /// <summary>The rows of a plane.</summary>
    /// <param name="plane">The samples.</param>
    /// <param name="flags">What is known of each; same shape.</param>
    /// <param name="without">Samples with any of these flags take no part in windows.</param>
    /// <param name="radius">Largest radius of a window, 0 or more.</param>
    /// <param name="scratch">Gives memory where samples take no part.</param>
    public ReflectedRows(Plane<T> plane, Plane<SampleFlags> flags, SampleFlags without, int radius, IScratch scratch)
    {
        this.plane = plane;
        Radius = radius;
        if (!FlagSearch.Any(flags.Samples, without))
            return;
        Plane<byte> mask = scratch.Rent<byte>(checked(plane.Width + (2 * radius)), plane.Height);
        for (int y = 0; y < plane.Height; y++)
        {
            Span<byte> row = mask.Row(y), inner = row.Slice(radius, plane.Width);
            FlagSearch.Mark(flags.Row(y), without, inner);
            for (int i = 1; i <= radius; i++)
            {
                row[radius - i] = inner[Reflection.Index(-i, inner.Length)];
                row[radius + inner.Length - 1 + i] = inner[Reflection.Index(inner.Length - 1 + i, inner.Length)];
            }
        }

        outsiders = mask;
    }

    /// <summary>Largest radius of a window, in samples.</summary>
    public int Radius { get; }

    /// <summary>Samples in a row.</summary>
    public int Width => plane.Width;

    /// <summary>Rows.</summary>
    public int Height => plane.Height;

    /// <summary>The samples, row after row.</summary>
    internal T[] Buffer => plane.Buffer;

    /// <summary>True when every sample of the plane takes part.</summary>
    public bool AllTakePart => outsiders is null;

    /// <summary>The sample at (x, y), which may lie outside of the plane; a negative zero as zero.</summary>
    public T this[int x, int y] => plane[Reflection.Index(x, plane.Width), Reflection.Index(y, plane.Height)] + T.Zero;

    /// <summary>The stored samples of part of a row of the plane.</summary>
    public ReadOnlySpan<T> Plain(int x, int y, int count) => plane.Row(y).Slice(x, count);

    /// <summary>True when samples can be read from <see cref="Buffer"/> as well as by <see cref="Copy"/>.</summary>
    internal bool IsPlain(int x, int y, int length) =>
        x >= 0 && x + length <= plane.Width && (uint)y < (uint)plane.Height
        && (outsiders is not { } mask || !mask.Row(y).Slice(x + Radius, length).Contains((byte)1));

    /// <summary>Copies samples of row <paramref name="y"/> from column <paramref name="x"/> on; those that take no part read as the highest of their type.</summary>
    public void Copy(int x, int y, Span<T> into)
    {
        int row = Reflection.Index(y, plane.Height);
        ReadOnlySpan<T> samples = plane.Row(row);
        int first = Math.Clamp(-x, 0, into.Length), end = Math.Clamp(samples.Length - x, first, into.Length);
        if (end > first)
            samples[(x + first)..(x + end)].CopyTo(into[first..end]);
        for (int i = 0; i < first; i++)
            into[i] = samples[Reflection.Index(x + i, samples.Length)];
        for (int i = end; i < into.Length; i++)
            into[i] = samples[Reflection.Index(x + i, samples.Length)];
        if (outsiders is { } mask)
        {
            // What lies further out than any window reaches is never looked at.
            int from = Math.Max(0, -Radius - x), to = Math.Min(into.Length, samples.Length + Radius - x);
            ReadOnlySpan<byte> known = mask.Row(row);
            for (int i = from; i < to; i++)
            {
                int next = known[(x + i + Radius)..(x + to + Radius)].IndexOf((byte)1);
                if (next < 0)
                    break;
                i += next;
                into[i] = Highest;
            }
        }
    }

    /// <summary>True when the sample at (x, y) takes part; x from -Radius to Width + Radius, any y.</summary>
    public bool TakesPart(int x, int y) =>
        outsiders is not { } mask || mask[x + Radius, Reflection.Index(y, plane.Height)] == 0;

    /// <summary>True when every sample of the window of a radius around (x, y) takes part.</summary>
    public bool AllTakePartIn(int x, int y, int radius)
    {
        if (outsiders is null)
            return true;
        for (int row = y - radius; row <= y + radius; row++)
        {
            if (Outsiders(row).Slice(x + Radius - radius, (2 * radius) + 1).ContainsAnyExcept((byte)0))
                return false;
        }

        return true;
    }

    /// <summary>For row <paramref name="y"/>, any y: 1 where a sample takes no part; columns from -Radius to Width + Radius.</summary>
    internal ReadOnlySpan<byte> Outsiders(int y) =>
        outsiders is { } mask ? mask.Row(Reflection.Index(y, plane.Height)) : throw new InvalidOperationException("all take part");

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
