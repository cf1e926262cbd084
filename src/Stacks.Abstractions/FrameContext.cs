namespace Stacks.Abstractions;

/// <summary>Runs work over bands of rows, on one thread or several.</summary>
public interface IRowBands
{
    /// <summary>
    /// Calls <paramref name="work"/> with disjoint ranges [first, end) that cover [0, height) and returns when all are
    /// done. Ranges may run at the same time; the caller's results must not depend on where they are cut.
    /// </summary>
    void ForEach(int height, Action<int, int> work);
}

/// <summary>Pooled memory that lives until the running step returns.</summary>
public interface IScratch
{
    /// <summary>A plane with undefined content, which does not move in memory until it is taken back. Safe to call from several bands at once.</summary>
    Plane<T> Rent<T>(int width, int height)
        where T : unmanaged;
}

/// <summary>What a step is given besides samples.</summary>
public sealed class FrameContext
{
    /// <summary>Index of the frame in its stack, from 0.</summary>
    public required int FrameIndex { get; init; }

    /// <summary>Noise of this frame in value units; null only for filters that do not need one.</summary>
    public NoiseModel? Noise { get; init; }

    /// <summary>True when any sample is flagged missing: kernels may take a shorter way when none is.</summary>
    public bool HasMissing { get; init; }

    /// <summary>True when any sample is flagged saturated.</summary>
    public bool HasSaturated { get; init; }

    /// <summary>Row bands.</summary>
    public required IRowBands Bands { get; init; }

    /// <summary>Scratch.</summary>
    public required IScratch Scratch { get; init; }

    /// <summary>Receives figures a step measures on the frame (name, value), such as a resolved range sigma.</summary>
    public Action<string, double>? Report { get; init; }

    /// <summary>Cancellation; steps check it between bands, not in the pixel loop.</summary>
    public CancellationToken Cancellation { get; init; }
}
