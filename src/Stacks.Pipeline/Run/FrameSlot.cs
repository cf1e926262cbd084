using System.Collections.Concurrent;
using System.Security.Cryptography;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Pipeline;

/// <summary>The memory that one frame in flight takes, and what is known of that frame. Used again for later frames.</summary>
internal sealed class FrameSlot : IDisposable
{
    /// <summary>Index of the frame.</summary>
    public int Frame { get; set; }

    /// <summary>Bytes as they stand in the source; where they decode in place, stored samples after that.</summary>
    public ByteBuffer Raw { get; } = new();

    /// <summary>Stored samples of the source where they do not stand in <see cref="Raw"/>; patched in place when only selective steps apply.</summary>
    public ByteBuffer Stored { get; } = new();

    /// <summary>Stored samples of the result, where they are not the source's patched.</summary>
    public ByteBuffer Result { get; } = new();

    /// <summary>The frame.</summary>
    public FramePlanes Whole { get; } = new();

    /// <summary>One sub-lattice of it.</summary>
    public FramePlanes Part { get; } = new();

    /// <summary>Digest of the stored samples, taken piece by piece.</summary>
    public IncrementalHash Digest { get; } = IncrementalHash.CreateHash(HashAlgorithmName.SHA256);

    /// <summary>Scratch for steps and measurements.</summary>
    public Scratch Scratch { get; } = new();

    /// <summary>Bytes as they stand in the result.</summary>
    public EncodedFrame Encoded { get; } = new();

    /// <summary>What steps measured on the frame; null when nothing.</summary>
    public List<StepFigure>? Figures { get; set; }

    /// <summary>What the processor found out about the frame.</summary>
    public FrameAccount? Account { get; set; }

    public void Dispose() => Digest.Dispose();
}

/// <summary>What the sink is told about a frame besides its bytes.</summary>
/// <param name="Row">The ledger's row.</param>
/// <param name="Prepared">The steps that were applied.</param>
/// <param name="Noise">The noise model used; null for none.</param>
/// <param name="NoiseRatio">Measured noise over the model's; NaN when not compared.</param>
/// <param name="Figures">What steps measured on the frame; null when nothing.</param>
internal sealed record FrameAccount(
    LedgerRow Row, PreparedFrame Prepared, FrameNoise? Noise, double NoiseRatio, IReadOnlyList<StepFigure>? Figures);

/// <summary>A figure that a step measured on a frame.</summary>
/// <param name="Step">Number of the step, from 1.</param>
/// <param name="Name">What it is.</param>
/// <param name="Value">The figure.</param>
internal sealed record StepFigure(int Step, string Name, double Value);

/// <summary>At most a given number of slots. The one returned last is lent first: its memory is warm.</summary>
internal sealed class SlotPool(int capacity) : IDisposable
{
    private readonly SemaphoreSlim places = new(capacity);
    private readonly ConcurrentStack<FrameSlot> free = new();
    private int made;

    /// <summary>Slots made so far.</summary>
    public int Made => made;

    /// <summary>Waits for a slot.</summary>
    public async Task<FrameSlot> LendAsync(CancellationToken cancellation)
    {
        await places.WaitAsync(cancellation).ConfigureAwait(false);
        if (free.TryPop(out FrameSlot? slot))
            return slot;
        Interlocked.Increment(ref made);
        return new FrameSlot();
    }

    /// <summary>Takes a slot back.</summary>
    public void Return(FrameSlot slot)
    {
        slot.Account = null;
        slot.Figures = null;
        free.Push(slot);
        places.Release();
    }

    public void Dispose()
    {
        places.Dispose();
        foreach (FrameSlot slot in free)
            slot.Dispose();
    }
}
