namespace Stacks.Formats.Tiff;

/// <summary>
/// A window on a file for a walk over its structure: directories and small arrays that lie close together cost one
/// read. For one thread.
/// </summary>
internal sealed class FileWindow(TiffFile file)
{
    private const int Ahead = 4096;
    private byte[] bytes = new byte[Ahead];
    private long start;
    private int length;

    /// <summary>Bytes [offset, offset + count), which must lie in the file; valid until the next call.</summary>
    public ReadOnlySpan<byte> At(long offset, int count)
    {
        if (offset < start || offset + count > start + length)
        {
            int wanted = (int)Math.Min(Math.Max(count, Ahead), file.Length - offset);
            if (bytes.Length < wanted)
                bytes = new byte[wanted];
            length = 0;
            file.Read(offset, bytes.AsSpan(0, wanted));
            start = offset;
            length = wanted;
        }

        return bytes.AsSpan((int)(offset - start), count);
    }
}
