using Microsoft.Win32.SafeHandles;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>An input file that is read at places, by any number of threads.</summary>
internal sealed class FitsFile : IDisposable
{
    private readonly SafeFileHandle handle;

    /// <summary>Opens a file for reading.</summary>
    /// <exception cref="InputMissingException">There is no such file.</exception>
    /// <exception cref="StackIOException">It cannot be opened.</exception>
    public FitsFile(string path)
    {
        Path = path;
        try
        {
            handle = File.OpenHandle(path, FileMode.Open, FileAccess.Read, FileShare.Read, FileOptions.RandomAccess);
            Length = RandomAccess.GetLength(handle);
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

    /// <summary>Bytes in the file when it was opened.</summary>
    public long Length { get; }

    /// <summary>Fills the buffer with the bytes at an offset.</summary>
    /// <exception cref="StackIOException">The operating system failed.</exception>
    /// <exception cref="StackFormatException">The file ends before the buffer is full.</exception>
    public void Read(Span<byte> buffer, long offset)
    {
        try
        {
            while (buffer.Length > 0)
            {
                int read = RandomAccess.Read(handle, buffer, offset);
                if (read == 0)
                    throw new StackFormatException($"{Path}, byte {offset}", "the file ends here; it has become shorter since it was opened", "check what else writes to it and run again");
                buffer = buffer[read..];
                offset += read;
            }
        }
        catch (IOException e)
        {
            throw new StackIOException($"{Path}, byte {offset}", $"reading failed ({e.Message})", "check the disk or the network and run again", e);
        }
    }

    /// <inheritdoc/>
    public void Dispose() => handle.Dispose();
}
