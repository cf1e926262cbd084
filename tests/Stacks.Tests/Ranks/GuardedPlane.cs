using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Tests.Ranks;

/// <summary>
/// A plane whose last sample lies within 8 bytes of a page that cannot be read, so that a kernel that reads further ends the
/// test run. On Linux; elsewhere a plain plane.
/// </summary>
internal sealed class GuardedPlane<T> : IDisposable
    where T : unmanaged
{
    private const int Page = 4096, Attempts = 200, ArrayAlignment = 8, Overhead = 24;

    private readonly List<Array> fillers = [];
    private readonly nint guard;

    public GuardedPlane(int width, int height)
    {
        int bytes = width * height * Unsafe.SizeOf<T>();
        T[] buffer = new T[width * height];
        for (int i = 0; i < Attempts && OperatingSystem.IsLinux(); i++)
        {
            // Arrays begin where they happen to: others of the missing size shift the next one.
            buffer = GC.AllocateArray<T>((bytes + (2 * Page)) / Unsafe.SizeOf<T>(), pinned: true);
            nint end = Marshal.UnsafeAddrOfPinnedArrayElement(buffer, 0) + Aligned(bytes);
            if (end % Page == 0)
            {
                guard = end;
                break;
            }

            fillers.Add(buffer);
            fillers.Add(GC.AllocateUninitializedArray<byte>((int)(Page - ((end + Aligned(bytes + (2 * Page)) + (2 * Overhead)) % Page)), pinned: true));
        }

        Plane = new Plane<T>(buffer, width, height);
        if (guard != 0 && Pages.Protect(guard, Page, 0) != 0)
            guard = 0;
        IsGuarded = guard != 0;
    }

    /// <summary>The plane.</summary>
    public Plane<T> Plane { get; }

    /// <summary>True when the page behind it cannot be read.</summary>
    public bool IsGuarded { get; }

    public void Dispose()
    {
        if (guard != 0)
            _ = Pages.Protect(guard, Page, 3);
        GC.KeepAlive(fillers);
    }

    private static int Aligned(int bytes) => (bytes + ArrayAlignment - 1) / ArrayAlignment * ArrayAlignment;
}

/// <summary>Pages of memory.</summary>
internal static partial class Pages
{
    /// <summary>Sets what may be done with a page: 0 nothing, 3 reading and writing. 0 on success.</summary>
    [LibraryImport("libc", EntryPoint = "mprotect")]
    public static partial int Protect(nint address, nint length, int protection);
}
