using System.Globalization;
using Microsoft.Win32.SafeHandles;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>An output file under its partial name, written and read back at places.</summary>
internal sealed class PartialFile : IDisposable
{
    private const int DiskFull = 28; // ENOSPC of Linux
    private const int QuotaExceeded = 122; // EDQUOT of Linux
    private readonly string path;
    private readonly SafeFileHandle handle;

    /// <summary>Creates a file, or empties the one that is there.</summary>
    /// <exception cref="OutputException">It cannot be created.</exception>
    public PartialFile(string path, FileOptions options = FileOptions.None)
    {
        this.path = path;
        try
        {
            handle = File.OpenHandle(path, FileMode.Create, FileAccess.ReadWrite, FileShare.Read, options);
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException or NotSupportedException)
        {
            throw new OutputException(path, $"cannot be created ({e.Message})", "check that the folder exists and may be written to", e);
        }
    }

    /// <summary>Writes all bytes at an offset.</summary>
    /// <exception cref="StackIOException">The operating system failed; disk full and file too large are named.</exception>
    public void Write(ReadOnlySpan<byte> bytes, long offset)
    {
        try
        {
            RandomAccess.Write(handle, bytes, offset);
        }
        catch (IOException e)
        {
            (string what, string remedy) = e.HResult switch
            {
                DiskFull => ("the disk is full (ENOSPC)", "make room and run again"),
                QuotaExceeded => ("the quota is used up (EDQUOT)", "make room and run again"),
                _ => ($"writing failed ({e.Message})", "check the disk or the network and run again"),
            };
            throw new StackIOException(Place(offset), what, remedy, e);
        }
        catch (ArgumentOutOfRangeException e)
        {
            // .NET reports EFBIG in this way.
            throw new StackIOException(Place(offset), "the file is larger than the file system or the file size limit allows (EFBIG)", "write elsewhere, or raise the limit (ulimit -f)", e);
        }
    }

    /// <summary>Reads back bytes that were written.</summary>
    /// <exception cref="StackIOException">The operating system failed.</exception>
    public void Read(Span<byte> bytes, long offset)
    {
        try
        {
            while (bytes.Length > 0)
            {
                int read = RandomAccess.Read(handle, bytes, offset);
                if (read == 0)
                    throw new EndOfStreamException("bytes that were written are not there");
                bytes = bytes[read..];
                offset += read;
            }
        }
        catch (IOException e)
        {
            throw new StackIOException(Place(offset), $"reading back failed ({e.Message})", "check the disk or the network and run again", e);
        }
    }

    /// <inheritdoc/>
    public void Dispose() => handle.Dispose();

    private string Place(long offset) => string.Create(CultureInfo.InvariantCulture, $"{path}, byte {offset}");
}
