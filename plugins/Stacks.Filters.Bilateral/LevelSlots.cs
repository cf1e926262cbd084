using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// Which range levels a grid holds, and in which slot. Only levels that occur get one; levels of few members are left to
/// <see cref="ThinLevels{T}"/>. Neighbouring levels lie in neighbouring slots, and every run of them has idle slots before
/// and behind, so that sixteen levels about any member can be read and written at once; what falls into idle slots is
/// thrown away. What memory cannot hold at once is a matter of several batches.
/// </summary>
internal sealed class LevelSlots
{
    private readonly GuideLevels guide;
    private readonly int window;
    private readonly int most;
    private readonly Plane<int> slots;
    private readonly Plane<double> values;
    private int next;

    /// <summary>Rents planes and counts members.</summary>
    /// <param name="grid">Sets how many slots there are at once, and which levels are thin.</param>
    /// <param name="guide">Who is on which level.</param>
    /// <param name="window">J, levels of a sample.</param>
    /// <param name="scratch">Scratch.</param>
    public LevelSlots(SpatialGrid grid, GuideLevels guide, int window, IScratch scratch)
    {
        (this.guide, this.window, most) = (guide, window, grid.MostSlots);
        slots = scratch.Rent<int>(GuideLevels.Axis, 1);
        values = scratch.Rent<double>(most, 1);
        Busy = scratch.Rent<float>(most, 1);
        Members = scratch.Rent<int>(GuideLevels.Axis, 1);
        Thin = grid.ThinMembers;
        int members = 0;
        for (int level = 0; level < GuideLevels.Axis; level++)
        {
            members += guide.Counts.Samples[level] - (level < window ? 0 : guide.Counts.Samples[level - window]);
            Members.Samples[level] = members;
        }

        while (ThinSamples() > grid.ThinCapacity)
            Thin /= 2;
        foreach (int count in Members.Samples)
            Thick += count > Thin ? 1 : 0;
    }

    /// <summary>Samples that have a weight on each level.</summary>
    public Plane<int> Members { get; }

    /// <summary>Members up to which a level gets no slot.</summary>
    public int Thin { get; private set; }

    /// <summary>Levels of more members than that: those that need a slot.</summary>
    public int Thick { get; }

    /// <summary>Slots of this batch, a multiple of sixteen.</summary>
    public int Count { get; private set; }

    /// <summary>1 for slots whose level is in this batch, 0 for idle ones.</summary>
    public Plane<float> Busy { get; }

    /// <summary>Bytes of all this.</summary>
    public static long Bytes(int most) => (GuideLevels.Axis * 8L) + (most * 12L);

    /// <summary>True when samples whose first level this is have a weight on any thin level.</summary>
    public bool IsThin(int level) => level + window <= GuideLevels.Axis && Members.Samples.Slice(level, window).ContainsAnyInRange(0, Thin);

    /// <summary>Starts again with the first batch.</summary>
    public void Restart() => next = 0;

    /// <summary>Fills the slots with levels not yet served; false when there are none.</summary>
    public bool NextBatch()
    {
        slots.Samples.Fill(-1);
        Count = 0;
        int behind = 0;
        int level = next;
        for (; level < GuideLevels.Axis; level++)
        {
            if (Members.Samples[level] <= Thin)
                continue;
            int first = Math.Max(behind, level - window + 1), end = level + LevelWeights.Lanes;
            if (Count + end - first > most)
                break;
            for (behind = first; behind < end; behind++, Count++)
            {
                slots.Samples[behind] = Count;
                values.Samples[Count] = ValueNear(behind);
                Busy.Samples[Count] = 0;
            }

            Busy.Samples[slots.Samples[level]] = 1;
        }

        next = level;
        for (; Count % LevelWeights.Lanes != 0; Count++)
            (values.Samples[Count], Busy.Samples[Count]) = (0, 0);
        return Count > 0;
    }

    /// <summary>The slot of the first of sixteen levels, or -1 where they have no neighbouring slots: then none of them is busy.</summary>
    public int SixteenAt(int level)
    {
        int slot = slots.Samples[level];
        return slot >= 0 && slots.Samples[level + LevelWeights.Lanes - 1] == slot + LevelWeights.Lanes - 1 ? slot : -1;
    }

    /// <summary>The values of sixteen slots' levels, less <paramref name="origin"/>.</summary>
    public TLanes Sixteen<TLanes>(int slot, double origin)
        where TLanes : struct, ILevelLanes<TLanes>
    {
        Span<float> levels = stackalloc float[LevelWeights.Lanes];
        for (int i = 0; i < levels.Length; i++)
            levels[i] = From(origin, Value(slot + i));
        return TLanes.Load(ref levels[0], 0);
    }

    /// <summary>A value less an origin near to it.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static float From<T>(double origin, T value)
        where T : unmanaged, IBinaryFloatingPointIeee754<T> => (float)(double.CreateTruncating(value) - origin);

    /// <summary>A value that members of the slot's level have; sums of a level are taken from it on.</summary>
    public double Value(int slot) => values.Samples[slot];

    /// <summary>
    /// The sixteen levels that serve most of a tile: from <paramref name="level"/> on, or from the first level on that
    /// has a slot when that still serves some; -1 when sixteen neighbouring slots are not to be had.
    /// </summary>
    public int SixteenFrom(ref int level)
    {
        int last = level + LevelWeights.Lanes - window;
        while (level < last && slots.Samples[level] < 0)
            level++;
        return SixteenAt(level);
    }

    private long ThinSamples()
    {
        long samples = 0;
        for (int level = 0; level < GuideLevels.Axis; level++)
        {
            if (guide.Counts.Samples[level] > 0 && IsThin(level))
                samples += guide.Counts.Samples[level];
        }

        return samples;
    }

    /// <summary>The value of a sample whose window has this level nearest to its middle.</summary>
    private double ValueNear(int level)
    {
        int middle = level - (window / 2);
        for (int apart = 0; apart < window; apart++)
        {
            if (middle + apart < GuideLevels.Axis && guide.Counts.Samples[middle + apart] > 0)
                return guide.Values.Samples[middle + apart];
            if (middle >= apart && guide.Counts.Samples[middle - apart] > 0)
                return guide.Values.Samples[middle - apart];
        }

        return 0;
    }
}
