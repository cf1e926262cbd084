using System.Buffers;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Reads a quality mask, strip by strip where it is not compressed: a sample of value 0 is good, any other is missing.</summary>
internal static class QualityMask
{
    private const int StripBytes = 1 << 17;

    /// <summary>Adds <see cref="SampleFlags.Missing"/> where a plane of the mask is not 0.</summary>
    public static void Mark(FitsReader reader, Hdu mask, long plane, Span<SampleFlags> flags)
    {
        FrameLayout layout = mask.Layout!;
        int size = layout.SampleType.Size();
        byte[] rented = ArrayPool<byte>.Shared.Rent(mask.Tiles is null ? 2 * StripBytes : (int)layout.StoredBytes);
        try
        {
            if (mask.Tiles is not null)
            {
                Span<byte> stored = rented.AsSpan(0, (int)layout.StoredBytes);
                reader.ReadStored(mask, plane, stored);
                Mark(layout, stored, flags);
                return;
            }

            for (int done = 0; done < flags.Length;)
            {
                int count = Math.Min(StripBytes / size, flags.Length - done);
                Span<byte> data = rented.AsSpan(0, count * size);
                Span<byte> stored = rented.AsSpan(StripBytes, count * size);
                reader.File.Read(data, FitsReader.OffsetOf(mask, plane) + ((long)done * size));
                SampleEncoding.Decode(layout.SampleType, data, stored);
                Mark(layout, stored, flags.Slice(done, count));
                done += count;
            }
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(rented);
        }
    }

    private static void Mark(FrameLayout layout, ReadOnlySpan<byte> stored, Span<SampleFlags> flags)
    {
        // The value 0 is stored as 0 but in a mask with a BZERO of its own.
        long good = (long)Math.Round(layout.Transform.ToStored(0));
        switch (layout.SampleType.Size())
        {
            case 1:
                MarkOthers(stored, (byte)good, flags);
                break;
            case 2:
                MarkOthers(MemoryMarshal.Cast<byte, ushort>(stored), (ushort)good, flags);
                break;
            case 4:
                MarkOthers(MemoryMarshal.Cast<byte, uint>(stored), (uint)good, flags);
                break;
            default:
                MarkOthers(MemoryMarshal.Cast<byte, ulong>(stored), (ulong)good, flags);
                break;
        }
    }

    private static void MarkOthers<T>(ReadOnlySpan<T> samples, T good, Span<SampleFlags> flags)
        where T : unmanaged, IEquatable<T>
    {
        for (int i = samples.IndexOfAnyExcept(good); i >= 0 && i < samples.Length; i++)
        {
            if (!samples[i].Equals(good))
                flags[i] |= SampleFlags.Missing;
        }
    }
}
