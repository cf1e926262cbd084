using System.Buffers;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Reads a quality mask strip by strip: a sample of value 0 is good, any other is missing.</summary>
internal static class QualityMask
{
    private const int StripBytes = 1 << 17;

    /// <summary>Adds <see cref="SampleFlags.Missing"/> where a plane of the mask is not 0.</summary>
    public static void Mark(FitsFile file, Hdu mask, long plane, Span<SampleFlags> flags)
    {
        FrameLayout layout = mask.Layout!;
        int size = layout.SampleType.Size();
        byte[] rented = ArrayPool<byte>.Shared.Rent(2 * StripBytes);
        try
        {
            for (int done = 0; done < flags.Length;)
            {
                int count = Math.Min(StripBytes / size, flags.Length - done);
                Span<byte> data = rented.AsSpan(0, count * size);
                Span<byte> stored = rented.AsSpan(StripBytes, count * size);
                file.Read(data, FitsReader.OffsetOf(mask, plane) + ((long)done * size));
                SampleEncoding.Decode(layout.SampleType, data, stored);

                // The value 0 is stored as 0 but in a mask with a BZERO of its own.
                long good = (long)Math.Round(layout.Transform.ToStored(0));
                Span<SampleFlags> strip = flags.Slice(done, count);
                switch (size)
                {
                    case 1:
                        MarkOthers(stored, (byte)good, strip);
                        break;
                    case 2:
                        MarkOthers(MemoryMarshal.Cast<byte, ushort>(stored), (ushort)good, strip);
                        break;
                    case 4:
                        MarkOthers(MemoryMarshal.Cast<byte, uint>(stored), (uint)good, strip);
                        break;
                    default:
                        MarkOthers(MemoryMarshal.Cast<byte, ulong>(stored), (ulong)good, strip);
                        break;
                }

                done += count;
            }
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(rented);
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
