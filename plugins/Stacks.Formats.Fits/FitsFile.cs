using Microsoft.Win32.SafeHandles;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>An input file, gzipped or not, that is read at places, by any number of threads. Places are in what it holds.</summary>
internal sealed class FitsFile : IDisposable
{
    private readonly SafeFileHandle handle;
    private readonly long fileLength;
    private readonly GzipBytes? gzip;

    /// <summary>Opens a file for reading.</summary>
    /// <exception cref="InputMissingException">There is no such file.</exception>
    /// <exception cref="StackIOException">It cannot be opened.</exception>
    public FitsFile(string path)
    {
        Path = path;
        try
        {
            handle = File.OpenHandle(path, FileMode.Open, FileAccess.Read, FileShare.Read, FileOptions.RandomAccess);
            fileLength = RandomAccess.GetLength(handle);
            Span<byte> start = stackalloc byte[2];
            if (RandomAccess.Read(handle, start, 0) == start.Length && start is [0x1F, 0x8B])
                gzip = new GzipBytes(path);
        }
        catch (Exception e) when (e is FileNotFoundException or DirectoryNotFoundException)
        {
            throw new InputMissingException(path, "no such file", "check the path");
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException or NotSupportedException)
        {
            throw new StackIOException(path, $"cannot be opened ({e.Message})", "check that it is a file and may be read", e);
        }
    }

    /// <summary>Path as given.</summary>
    public string Path { get; }

    /// <summary>True when the file is gzipped.</summary>
    public bool IsGzipped => gzip is not null;

    /// <summary>Bytes in the file when it was opened; of a gzipped one, the bytes of what it holds that are known by now.</summary>
    public long Length => gzip?.Known ?? fileLength;

    /// <summary>
    /// More bytes than a gzipped file can hold, whatever is in it: Deflate stands for 258 bytes in two bits at most
    /// (RFC 1951). Null for a plain file.
    /// </summary>
    public long? MostInflated => gzip is null ? null : 1032 * fileLength;

    /// <summary>Why a gzipped file is not whole; null while it seems to be.</summary>
    public string? Damage => gzip?.DamagedAt is { } offset
        ? $"the gzip stream is damaged: it cannot be inflated beyond byte {offset} of what it holds, or its checksum does not agree and any frame may hold wrong samples"
        : null;

    /// <summary>How many of the bytes from an offset on are in the file.</summary>
    /// <exception cref="StackIOException">The operating system failed.</exception>
    public long Present(long offset, long count)
    {
        try
        {
            return gzip?.Present(offset, count) ?? Math.Clamp(fileLength - offset, 0, count);
        }
        catch (IOException e)
        {
            throw ReadingFailed(offset, e);
        }
    }

    /// <summary>Fills the buffer with the bytes at an offset.</summary>
    /// <exception cref="StackIOException">The operating system failed.</exception>
    /// <exception cref="StackFormatException">The file ends before the buffer is full.</exception>
    public void Read(Span<byte> buffer, long offset)
    {
        try
        {
            while (buffer.Length > 0)
            {
                int read = gzip?.Read(buffer, offset) ?? RandomAccess.Read(handle, buffer, offset);
                if (read == 0)
                    throw new StackFormatException($"{Path}, byte {offset}", "the file ends here; it has become shorter since it was opened", "check what else writes to it and run again");
                buffer = buffer[read..];
                offset += read;
            }
        }
        catch (IOException e)
        {
            throw ReadingFailed(offset, e);
        }
    }

    /// <inheritdoc/>
    public void Dispose()
    {
        gzip?.Dispose();
        handle.Dispose();
    }

    private StackIOException ReadingFailed(long offset, IOException e) =>
        new($"{Path}, byte {offset}", $"reading failed ({e.Message})", "check the disk or the network and run again", e);
}
