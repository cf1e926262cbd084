using Microsoft.Win32.SafeHandles;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>A file that is written from front to back, with every failure of the operating system named.</summary>
internal sealed class OutputFileStream : IDisposable
{
    private const int BufferSize = 1 << 20;
    private readonly SafeFileHandle handle;
    private readonly byte[] buffer = new byte[BufferSize];
    private int buffered;
    private long flushed;

    /// <summary>Creates the file, or empties it.</summary>
    /// <exception cref="OutputException">It cannot be created.</exception>
    public OutputFileStream(string path)
    {
        Path = path;
        try
        {
            handle = File.OpenHandle(path, FileMode.Create, FileAccess.ReadWrite, FileShare.Read);
        }
        catch (Exception error) when (error is IOException or UnauthorizedAccessException or NotSupportedException)
        {
            throw new OutputException(path, "the file cannot be created: " + error.Message, "check that the folder exists and may be written", error);
        }
    }

    /// <summary>Path of the file.</summary>
    public string Path { get; }

    /// <summary>Offset of the next byte.</summary>
    public long Position => flushed + buffered;

    /// <summary>Appends bytes.</summary>
    public void Append(ReadOnlySpan<byte> bytes)
    {
        if (bytes.Length > BufferSize - buffered)
            Flush();
        if (bytes.Length >= BufferSize)
        {
            WriteAt(flushed, bytes);
            flushed += bytes.Length;
            return;
        }

        bytes.CopyTo(buffer.AsSpan(buffered));
        buffered += bytes.Length;
    }

    /// <summary>Appends zeros up to a multiple of 8.</summary>
    public void Align() => Append(stackalloc byte[(int)(-Position & 7)]);

    /// <summary>Hands everything to the operating system.</summary>
    public void Flush()
    {
        WriteAt(flushed, buffer.AsSpan(0, buffered));
        flushed += buffered;
        buffered = 0;
    }

    /// <summary>Writes over bytes that have been flushed.</summary>
    /// <exception cref="StackIOException">The operating system failed.</exception>
    public void WriteAt(long offset, ReadOnlySpan<byte> bytes)
    {
        try
        {
            RandomAccess.Write(handle, bytes, offset);
        }
        catch (ArgumentOutOfRangeException error)
        {
            // .NET reports EFBIG this way.
            throw new StackIOException($"{Path}, byte {offset}", "the file has become too large for the file system or the user's limit (EFBIG)", "write to another file system, or raise the limit (ulimit -f)", error);
        }
        catch (IOException error)
        {
            throw new StackIOException($"{Path}, byte {offset}", "writing failed: " + error.Message, "check that the disk is not full (ENOSPC) and is in order", error);
        }
    }

    /// <inheritdoc/>
    public void Dispose() => handle.Dispose();
}
