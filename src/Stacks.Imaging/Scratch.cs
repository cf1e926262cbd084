using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>
/// Pooled scratch for one worker: the same sequence of rents gets the same buffers, so nothing is allocated after the
/// first frame. Buffers never move in memory. <see cref="Reset"/> takes all of them back at once.
/// </summary>
public sealed class Scratch : IScratch
{
    private readonly Lock gate = new();
    private readonly List<Array> free = [];
    private readonly List<Array> rented = [];

    /// <inheritdoc/>
    public Plane<T> Rent<T>(int width, int height)
        where T : unmanaged
    {
        int length = checked(width * height);
        lock (gate)
        {
            int best = -1;
            for (int i = 0; i < free.Count; i++)
            {
                if (free[i] is T[] candidate && candidate.Length >= length && (best < 0 || candidate.Length < free[best].Length))
                    best = i;
            }

            Array buffer;
            if (best >= 0)
            {
                buffer = free[best];
                free.RemoveAt(best);
            }
            else
            {
                buffer = GC.AllocateUninitializedArray<T>(length, pinned: true);
            }

            rented.Add(buffer);
            return new Plane<T>((T[])buffer, width, height);
        }
    }

    /// <summary>Takes back all planes; views on them must no longer be used.</summary>
    public void Reset()
    {
        lock (gate)
        {
            free.AddRange(rented);
            rented.Clear();
        }
    }
}
