using System.Buffers.Binary;
using Microsoft.Win32.SafeHandles;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>
/// An open file with its byte order and container kind. Reading is positional and safe for concurrent use; nothing is
/// memory-mapped, because a file that is cut short under a map kills the process.
/// </summary>
internal sealed class TiffFile : IDisposable
{
    private readonly SafeFileHandle handle;

    private TiffFile(string path, SafeFileHandle handle, bool allowTruncated)
    {
        Path = path;
        AllowTruncated = allowTruncated;
        this.handle = handle;
        Length = RandomAccess.GetLength(handle);
    }

    /// <summary>Path as given.</summary>
    public string Path { get; }

    /// <summary>Bytes in the file when it was opened.</summary>
    public long Length { get; }

    /// <summary>True to take what is whole of a truncated file.</summary>
    public bool AllowTruncated { get; }

    /// <summary>True for byte order <c>MM</c>.</summary>
    public bool BigEndian { get; private set; }

    /// <summary>True for BigTIFF (43), false for classic TIFF (42).</summary>
    public bool IsBig { get; private set; }

    /// <summary>Offset of the first directory.</summary>
    public long FirstDirectory { get; private set; }

    /// <summary>Bytes of an offset in a directory: 4 or 8.</summary>
    public int OffsetSize => IsBig ? 8 : 4;

    /// <summary>Opens a file and reads its header.</summary>
    /// <param name="path">Path.</param>
    /// <param name="allowTruncated">True to take what is whole of a truncated file.</param>
    /// <exception cref="InputMissingException">No such file.</exception>
    /// <exception cref="StackIOException">It cannot be opened.</exception>
    /// <exception cref="StackFormatException">The header is not one of TIFF.</exception>
    public static TiffFile Open(string path, bool allowTruncated = false)
    {
        SafeFileHandle? handle = null;
        try
        {
            handle = File.OpenHandle(path, FileMode.Open, FileAccess.Read, FileShare.ReadWrite, FileOptions.RandomAccess);
            TiffFile file = new(path, handle, allowTruncated);
            file.ReadHeader();
            return file;
        }
        catch (Exception error)
        {
            handle?.Dispose();
            throw error switch
            {
                FileNotFoundException or DirectoryNotFoundException => new InputMissingException(path, "there is no such file", "check the path"),
                IOException or UnauthorizedAccessException or NotSupportedException =>
                    new StackIOException(path, "the file cannot be opened: " + error.Message, "check that it is a plain file you may read", error),
                _ => error,
            };
        }
    }

    /// <summary>True when the bytes [offset, offset + length) are all in the file.</summary>
    public bool Holds(long offset, long length) =>
        offset >= 0 && length >= 0 && length <= Length && offset <= Length - length;

    /// <summary>Fills a buffer from an offset.</summary>
    /// <exception cref="StackIOException">The operating system failed.</exception>
    /// <exception cref="StackFormatException">The file has become shorter.</exception>
    public void Read(long offset, Span<byte> into)
    {
        int done = 0;
        while (done < into.Length)
        {
            int got;
            try
            {
                got = RandomAccess.Read(handle, into[done..], offset + done);
            }
            catch (IOException error)
            {
                throw new StackIOException($"{Path}, byte {offset + done}", "reading failed: " + error.Message, "check the disk or the network share", error);
            }

            if (got == 0)
                throw new StackFormatException($"{Path}, byte {offset + done}", "the file ends here and has become shorter since it was opened", "copy it again from its source");
            done += got;
        }
    }

    /// <summary>An unsigned whole number of 1, 2, 4 or 8 bytes in the file's byte order; beyond 2^63 - 1 it is held there.</summary>
    public long Number(ReadOnlySpan<byte> bytes) => bytes.Length switch
    {
        1 => bytes[0],
        2 => BigEndian ? BinaryPrimitives.ReadUInt16BigEndian(bytes) : BinaryPrimitives.ReadUInt16LittleEndian(bytes),
        4 => BigEndian ? BinaryPrimitives.ReadUInt32BigEndian(bytes) : BinaryPrimitives.ReadUInt32LittleEndian(bytes),
        _ => (long)Math.Min(BigEndian ? BinaryPrimitives.ReadUInt64BigEndian(bytes) : BinaryPrimitives.ReadUInt64LittleEndian(bytes), long.MaxValue),
    };

    /// <inheritdoc/>
    public void Dispose() => handle.Dispose();

    private void ReadHeader()
    {
        Span<byte> header = stackalloc byte[16];
        int there = (int)Math.Min(Length, header.Length);
        Read(0, header[..there]);
        if (there < 8 || !TiffFormat.HasSignature(header[..there]))
            throw new StackFormatException($"{Path}, byte 0", "this is not a TIFF file", "name a file that starts with II or MM and the number 42 or 43");
        BigEndian = header[0] == (byte)'M';
        IsBig = Number(header.Slice(2, 2)) == 43;
        if (IsBig && (there < 16 || Number(header.Slice(4, 2)) != 8 || Number(header.Slice(6, 2)) != 0))
            throw new StackFormatException($"{Path}, byte 4", "the BigTIFF header does not say that offsets have 8 bytes", "copy the file again from its source");
        FirstDirectory = IsBig ? Number(header.Slice(8, 8)) : Number(header.Slice(4, 4));
    }
}
