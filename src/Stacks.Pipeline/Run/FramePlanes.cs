using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Flags and values of one frame (or of one sub-lattice of it) on its way through the steps.</summary>
internal sealed class FramePlanes
{
    private const SampleFlags DecisionBits = SampleFlags.Replaced | SampleFlags.KeptAsSource;

    private readonly WorkPlane?[] planes = new WorkPlane?[4];
    private SampleFlags[] flags = [];
    private SampleFlags[] history = [];
    private bool hasHistory;
    private int width;
    private int height;

    /// <summary>What the next step is told; after <see cref="MergeHistory"/>, all that is known of every sample.</summary>
    public Plane<SampleFlags> Flags => new(flags, width, height);

    /// <summary>The values as the last step left them.</summary>
    public WorkPlane Current { get; private set; } = WorkPlane.Of(WorkType.UInt16);

    /// <summary>Fits flags to a shape, all of them None, without history.</summary>
    public void Shape(int width, int height)
    {
        (this.width, this.height) = (width, height);
        int length = checked(width * height);
        Clear(ref flags, length);
        hasHistory = false;
    }

    /// <summary>Makes the plane of a work type current and gives it the frame's shape; its values are undefined.</summary>
    public WorkPlane Start(WorkType type)
    {
        Current = PlaneOf(type);
        Current.Shape(width, height);
        return Current;
    }

    /// <summary>Converts the current values to a work type that holds them.</summary>
    public void Convert(WorkType type)
    {
        if (Current.Type == type)
            return;
        WorkPlane converted = PlaneOf(type);
        converted.Convert(Current);
        Current = converted;
    }

    /// <summary>
    /// Moves a selective step's decisions to the history, so that the next step sees none. A replaced sample is an
    /// ordinary one from here on: neither saturated nor a defect.
    /// </summary>
    public void MoveDecisionsToHistory()
    {
        Span<SampleFlags> now = Flags.Samples;
        if (!hasHistory && FlagScan.NextDecision(now, 0) >= 0)
        {
            Clear(ref history, now.Length);
            hasHistory = true;
        }

        for (int i = FlagScan.NextDecision(now, 0); i >= 0; i = FlagScan.NextDecision(now, i + 1))
        {
            history[i] |= now[i];
            now[i] &= (now[i] & SampleFlags.Replaced) != 0 ? SampleFlags.Missing : ~DecisionBits;
        }
    }

    /// <summary>Joins the history to the flags.</summary>
    public void MergeHistory()
    {
        if (!hasHistory)
            return;
        Span<ulong> now = MemoryMarshal.Cast<SampleFlags, ulong>(Flags.Samples);
        ReadOnlySpan<ulong> past = MemoryMarshal.Cast<SampleFlags, ulong>(history.AsSpan(0, width * height));
        for (int i = 0; i < now.Length; i++)
            now[i] |= past[i];
        for (int i = now.Length * sizeof(ulong); i < width * height; i++)
            flags[i] |= history[i];
    }

    /// <summary>Becomes one sub-lattice of a frame, flags and values.</summary>
    /// <param name="whole">The frame, for its flags.</param>
    /// <param name="values">The frame's values before any step.</param>
    /// <param name="lattice">The mosaic.</param>
    /// <param name="offsetX">Column of the sub-lattice's first sample.</param>
    /// <param name="offsetY">Row of the sub-lattice's first sample.</param>
    public void Split(FramePlanes whole, WorkPlane values, Lattice lattice, int offsetX, int offsetY)
    {
        Shape(Mosaic.Share(whole.width, lattice.PeriodX, offsetX), Mosaic.Share(whole.height, lattice.PeriodY, offsetY));
        Mosaic.Split(whole.Flags, lattice, offsetX, offsetY, Flags);
        Start(values.Type).Split(values, lattice, offsetX, offsetY);
    }

    /// <summary>Puts flags and values back at their places in the frame.</summary>
    public void Join(FramePlanes whole, Lattice lattice, int offsetX, int offsetY)
    {
        Mosaic.Join(Flags, lattice, offsetX, offsetY, whole.Flags);
        Current.Join(whole.Start(Current.Type), lattice, offsetX, offsetY);
    }

    private static void Clear(ref SampleFlags[] buffer, int length)
    {
        if (buffer.Length < length)
            buffer = new SampleFlags[length];
        else
            Array.Clear(buffer, 0, length);
    }

    private WorkPlane PlaneOf(WorkType type) => planes[(int)type] ??= WorkPlane.Of(type);
}
