using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// Puts files and folders on the disk and says so when that fails. FileStream.Flush(true) reports success even where
/// fsync fails, so the call is made here and its result is checked.
/// </summary>
internal static partial class Durable
{
    /// <summary>fsync of a file or a folder.</summary>
    /// <exception cref="StackIOException">The system reports that data did not reach the disk.</exception>
    public static void Sync(string path)
    {
        if (OperatingSystem.IsWindows())
            return;
        int file = Open(path, 0);
        if (file < 0)
            throw Failure(path, "cannot be opened for fsync");
        try
        {
            if (FileSync(file) != 0)
                throw Failure(path, "fsync failed");
        }
        finally
        {
            _ = Close(file);
        }
    }

    private static StackIOException Failure(string path, string what)
    {
        int error = Marshal.GetLastPInvokeError();
        string name = error switch
        {
            5 => " (EIO)",
            27 => " (EFBIG)",
            28 => " (ENOSPC)",
            _ => "",
        };
        return new StackIOException(path, $"{what}: {Marshal.GetPInvokeErrorMessage(error)}{name}", "check the disk and run again");
    }

    [LibraryImport("libc", EntryPoint = "open", SetLastError = true, StringMarshalling = StringMarshalling.Utf8)]
    private static partial int Open(string path, int flags);

    [LibraryImport("libc", EntryPoint = "fsync", SetLastError = true)]
    private static partial int FileSync(int file);

    [LibraryImport("libc", EntryPoint = "close", SetLastError = true)]
    private static partial int Close(int file);
}
