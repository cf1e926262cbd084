namespace Stacks.Formats.Fits;

/// <summary>
/// What a gzipped file holds, read at places although it can only be inflated from its beginning: a few passes stand at
/// different places, and the nearest one before the place asked for goes on from where it is. Frames in order, their masks
/// in order and the bytes for checksums each cost one pass over the file; memory does not grow with it. Safe for concurrent
/// use.
/// </summary>
internal sealed class GzipBytes(string path) : IDisposable
{
    private const int MostPasses = 4;
    private readonly List<GzipPass> idle = [];
    private readonly Lock gate = new();
    private long known;
    private long damagedAt = -1;

    /// <summary>Bytes that are known to be there; all of them once a pass has met the end.</summary>
    public long Known => Interlocked.Read(ref known);

    /// <summary>Where what the file holds ends, although the stream should not end there; null while no damage is known.</summary>
    public long? DamagedAt => Interlocked.Read(ref damagedAt) is >= 0 and long offset ? offset : null;

    /// <summary>How many of the bytes from an offset on are there.</summary>
    public long Present(long offset, long count)
    {
        if (offset + count <= Known)
            return count;
        GzipPass pass = Lend(offset);
        try
        {
            pass.SkipTo(offset + count);
            return Math.Max(0, pass.Position - offset);
        }
        finally
        {
            Return(pass);
        }
    }

    /// <summary>Fills a buffer from an offset on; returns how many bytes there were.</summary>
    public int Read(Span<byte> buffer, long offset)
    {
        GzipPass pass = Lend(offset);
        try
        {
            pass.SkipTo(offset);
            return pass.Position < offset ? 0 : pass.Read(buffer);
        }
        finally
        {
            Return(pass);
        }
    }

    /// <inheritdoc/>
    public void Dispose()
    {
        foreach (GzipPass pass in idle)
            pass.Dispose();
    }

    /// <summary>The nearest idle pass before an offset, else a new one; of too many the one that stands furthest on is given up.</summary>
    private GzipPass Lend(long offset)
    {
        lock (gate)
        {
            GzipPass? nearest = idle.Where(p => p.Position <= offset).MaxBy(p => p.Position);
            GzipPass? given = nearest ?? (idle.Count >= MostPasses ? idle.MaxBy(p => p.Position) : null);
            if (given is not null)
                idle.Remove(given);
            if (nearest is not null)
                return nearest;
            given?.Dispose();
            return new GzipPass(path);
        }
    }

    private void Return(GzipPass pass)
    {
        lock (gate)
        {
            idle.Add(pass);
            if (pass.Position > known)
                Interlocked.Exchange(ref known, pass.Position);
            if (pass.DamagedAt is { } offset)
                Interlocked.Exchange(ref damagedAt, offset);
        }
    }
}
