using System.Buffers;
using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Integrity of a file: checksums of every HDU, truncation, bytes that belong to none.</summary>
internal static class HealthCheck
{
    private const int StripBytes = 1 << 18;

    /// <summary>The findings, HDU by HDU; reads the whole file where there are checksums.</summary>
    public static IEnumerable<HealthFinding> Of(FitsReader reader, CancellationToken cancellation)
    {
        if (reader.File.Damage is { } damage)
            yield return new HealthFinding(true, damage);
        bool hasChecksum = false;
        foreach (Hdu hdu in reader.Hdus)
        {
            string name = string.Create(CultureInfo.InvariantCulture, $"HDU {hdu.Index} ({hdu.Label})");
            if (hdu.IsTruncated)
            {
                yield return Truncation(hdu, name);
                continue;
            }

            if (reader.File.Present(hdu.DataOffset, hdu.EndOffset - hdu.DataOffset) < hdu.EndOffset - hdu.DataOffset)
                yield return new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"{name}: the last block is not filled up: the file ends at byte {reader.File.Length}, not {hdu.EndOffset}; no sample is lost"));
            FitsHeader header = reader.ReadStoredHeader(hdu);
            string? dataSum = header.OwnText("DATASUM")?.Trim();
            string? checksum = header.OwnText("CHECKSUM")?.Trim();
            if (dataSum is null && checksum is null)
                continue;
            hasChecksum = true;
            uint data = Sum(reader.File, hdu.DataOffset, hdu.DataBytes, cancellation);
            if (dataSum is not null)
                yield return CompareDataSum(name, dataSum, data);
            if (checksum is not null)
            {
                uint all = FitsChecksum.Add(Sum(reader.File, hdu.HeaderOffset, header.Bytes, cancellation), data);
                yield return all is uint.MaxValue or 0
                    ? new HealthFinding(false, $"{name}: CHECKSUM agrees")
                    : new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"{name}: CHECKSUM does not agree: header or data have changed since it was written (sum {all:x8})"));
            }
        }

        if (!hasChecksum)
            yield return new HealthFinding(false, "the file has no checksums");
        if (reader.HeaderIsTruncated)
            yield return new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"HDU {reader.Hdus.Count} at byte {reader.ScannedEnd}: the file ends inside its header"));
        else if (reader.BytesBehind > 0)
            yield return new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"{reader.BytesBehind} bytes from byte {reader.ScannedEnd} on belong to no HDU"));
    }

    private static HealthFinding Truncation(Hdu hdu, string name)
    {
        string kept = hdu.Role == HduRole.Science ? string.Create(CultureInfo.InvariantCulture, $"; whole frames: {hdu.Planes} of {hdu.PromisedPlanes}") : "";
        return new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"{name}: truncated: the file ends at byte {hdu.DataOffset + hdu.PresentBytes}, the header promises data to byte {hdu.DataOffset + hdu.DataBytes}{kept}"));
    }

    private static HealthFinding CompareDataSum(string name, string text, uint sum)
    {
        if (!uint.TryParse(text, NumberStyles.None, CultureInfo.InvariantCulture, out uint stated))
            return new HealthFinding(true, $"{name}: DATASUM '{text}' is not a 32-bit number");
        return stated == sum
            ? new HealthFinding(false, $"{name}: DATASUM agrees")
            : new HealthFinding(true, string.Create(CultureInfo.InvariantCulture, $"{name}: DATASUM is {stated}, the data give {sum}: samples have changed since it was written"));
    }

    private static uint Sum(FitsFile file, long offset, long bytes, CancellationToken cancellation)
    {
        byte[] rented = ArrayPool<byte>.Shared.Rent(StripBytes);
        try
        {
            uint sum = 0;
            for (long done = 0; done < bytes;)
            {
                cancellation.ThrowIfCancellationRequested();
                Span<byte> strip = rented.AsSpan(0, (int)Math.Min(bytes - done, StripBytes));
                file.Read(strip, offset + done);
                sum = FitsChecksum.AddPart(sum, FitsChecksum.Sum(strip), done);
                done += strip.Length;
            }

            return sum;
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(rented);
        }
    }
}
