namespace Stacks.Abstractions;

/// <summary>
/// The readers of a stack that stands in many files, a few of them open at a time: one that is asked for again is opened
/// again. Safe for concurrent use.
/// </summary>
/// <param name="open">Opens the file of a number.</param>
/// <param name="most">Readers that stay open when nobody uses them, 1 or more.</param>
public sealed class ReaderPool(Func<int, IStackReader> open, int most) : IDisposable
{
    private readonly List<Entry> entries = [];
    private readonly Lock gate = new();

    /// <summary>Lends the reader of a file until the lease is disposed.</summary>
    /// <exception cref="StacksException">The file cannot be opened.</exception>
    public Lease Lend(int file)
    {
        lock (gate)
        {
            Entry? entry = entries.Find(e => e.File == file);
            if (entry is not null)
                entries.Remove(entry);
            entry ??= new Entry(file, open(file));
            entries.Add(entry); // the last used stands last
            entry.Users++;
            return new Lease(this, entry);
        }
    }

    /// <summary>Closes all readers.</summary>
    public void Dispose()
    {
        foreach (Entry entry in entries)
            entry.Reader.Dispose();
    }

    private void Return(Entry returned)
    {
        lock (gate)
        {
            returned.Users--;
            while (entries.Count > most && entries.Find(e => e.Users == 0) is { } oldest)
            {
                entries.Remove(oldest);
                oldest.Reader.Dispose();
            }
        }
    }

    /// <summary>A reader that stays open until this is disposed.</summary>
    public readonly struct Lease : IDisposable
    {
        private readonly ReaderPool pool;
        private readonly Entry entry;

        internal Lease(ReaderPool pool, object entry)
        {
            this.pool = pool;
            this.entry = (Entry)entry;
        }

        /// <summary>The reader.</summary>
        public IStackReader Reader => entry.Reader;

        /// <inheritdoc/>
        public void Dispose() => pool.Return(entry);
    }

    private sealed class Entry(int file, IStackReader reader)
    {
        public int File { get; } = file;

        public IStackReader Reader { get; } = reader;

        public int Users { get; set; }
    }
}
