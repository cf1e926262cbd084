using System.Buffers;
using System.Buffers.Binary;
using System.Globalization;
using System.Numerics;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>One tile from its bytes to stored samples (Standard 4.0, sections 10.1.3, 10.2 and 10.4).</summary>
internal static class TileSamples
{
    /// <summary>Bytes at the end of a gzip stream that say how many it holds, little-endian (RFC 1952, ISIZE).</summary>
    private const int GzipLengthBytes = 4;

    /// <summary>Decodes a whole tile.</summary>
    /// <param name="image">The image.</param>
    /// <param name="type">Type of the stored samples.</param>
    /// <param name="tile">Number of the tile, from 0.</param>
    /// <param name="entry">Its row of the table.</param>
    /// <param name="bytes">Its bytes.</param>
    /// <param name="part">Its shape.</param>
    /// <param name="stored">Receives all its samples, little-endian.</param>
    /// <returns>What is wrong with it; null when nothing is.</returns>
    public static string? Decode(TiledImage image, SampleType type, long tile, TileEntry entry, ReadOnlySpan<byte> bytes, TilePart part, Span<byte> stored)
    {
        bool isQuantised = entry.Source == TileSource.Compressed && image.IsQuantised;
        TileAlgorithm algorithm = entry.Source switch
        {
            TileSource.Compressed => image.Algorithm,
            TileSource.Gzipped => TileAlgorithm.Gzip1,
            _ => TileAlgorithm.None,
        };
        int size = type.Size();
        if (!isQuantised && BytesOf(algorithm, bytes) == stored.Length)
        {
            string? problem = DecodeBytes(algorithm, bytes, size, stored);
            SampleEncoding.Decode(type, stored, stored);
            return problem;
        }

        if (!isQuantised && algorithm == TileAlgorithm.Rice && image.BytePix == size)
            return Signed(type, stored, DecodeRice(bytes, image.BlockSize, size, stored));

        int[] rented = ArrayPool<int>.Shared.Rent(part.TileSamples);
        try
        {
            Span<int> integers = rented.AsSpan(0, part.TileSamples);
            if (DecodeIntegers(image, algorithm, bytes, part, integers) is { } problem)
                return problem;
            if (isQuantised)
            {
                Restore(image, tile, entry, integers, stored);
                return null;
            }

            return Signed(type, stored, Narrow(type, integers, stored));
        }
        finally
        {
            ArrayPool<int>.Shared.Return(rented);
        }
    }

    /// <summary>Floating-point samples out of the integers that stand for them.</summary>
    private static void Restore(TiledImage image, long tile, TileEntry entry, ReadOnlySpan<int> integers, Span<byte> stored)
    {
        long? blank = entry.HasBlank ? entry.Blank : null;
        long? seed = image.Seed > 0 ? tile + image.Seed - 1 : null;
        bool keepsZero = image.Quantisation == TileQuantisation.Dither2;
        if (image.BitPix == -32)
            Quantisation.Restore(integers, entry.Scale, entry.Zero, blank, seed, keepsZero, MemoryMarshal.Cast<byte, float>(stored));
        else
            Quantisation.Restore(integers, entry.Scale, entry.Zero, blank, seed, keepsZero, MemoryMarshal.Cast<byte, double>(stored));
    }

    /// <summary>The sign convention of the type, once its samples are there; the problem goes on.</summary>
    private static string? Signed(SampleType type, Span<byte> stored, string? problem)
    {
        if (problem is null)
            SampleEncoding.FlipSigns(type, stored);
        return problem;
    }

    private static string? DecodeIntegers(TiledImage image, TileAlgorithm algorithm, ReadOnlySpan<byte> bytes, TilePart part, Span<int> integers)
    {
        switch (algorithm)
        {
            case TileAlgorithm.Rice when image.BytePix == sizeof(int):
                return RiceCode.Decode(bytes, image.BlockSize, integers);
            case TileAlgorithm.Plio:
                return PlioCode.Decode(bytes, integers);
            case TileAlgorithm.Hcompress:
                return HcompressCode.Decode(bytes, part.Width, image.Smooth, integers);
        }

        long width = algorithm == TileAlgorithm.Rice ? image.BytePix : BytesOf(algorithm, bytes) / integers.Length;
        if (width is not (1 or 2 or 4) || (algorithm != TileAlgorithm.Rice && width * integers.Length != BytesOf(algorithm, bytes)))
            return string.Create(CultureInfo.InvariantCulture, $"it holds {BytesOf(algorithm, bytes)} bytes for {integers.Length} samples");
        int length = integers.Length * (int)width;
        byte[] rented = ArrayPool<byte>.Shared.Rent(length);
        try
        {
            Span<byte> narrow = rented.AsSpan(0, length);
            string? problem = algorithm == TileAlgorithm.Rice ? DecodeRice(bytes, image.BlockSize, (int)width, narrow) : DecodeBytes(algorithm, bytes, (int)width, narrow);
            if (problem is null)
                Widen(narrow, (int)width, algorithm != TileAlgorithm.Rice, integers);
            return problem;
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(rented);
        }
    }

    /// <summary>Bytes that a tile holds which is not coded as numbers; -1 for one that is.</summary>
    private static long BytesOf(TileAlgorithm algorithm, ReadOnlySpan<byte> bytes) => algorithm switch
    {
        TileAlgorithm.None => bytes.Length,
        TileAlgorithm.Gzip1 or TileAlgorithm.Gzip2 => bytes.Length < GzipLengthBytes ? 0 : BinaryPrimitives.ReadUInt32LittleEndian(bytes[^GzipLengthBytes..]),
        _ => -1,
    };

    /// <summary>Big-endian samples of <paramref name="size"/> bytes out of a tile that holds as many.</summary>
    private static string? DecodeBytes(TileAlgorithm algorithm, ReadOnlySpan<byte> bytes, int size, Span<byte> samples)
    {
        if (algorithm == TileAlgorithm.None)
        {
            bytes.CopyTo(samples);
            return null;
        }

        if (algorithm == TileAlgorithm.Gzip1 || size == 1)
            return GzipTile.Decode(bytes, samples);
        byte[] rented = ArrayPool<byte>.Shared.Rent(samples.Length);
        try
        {
            Span<byte> shuffled = rented.AsSpan(0, samples.Length);
            string? problem = GzipTile.Decode(bytes, shuffled);
            if (problem is null)
                GzipTile.Unshuffle(shuffled, size, samples);
            return problem;
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(rented);
        }
    }

    private static string? DecodeRice(ReadOnlySpan<byte> bytes, int blockSize, int size, Span<byte> samples) => size switch
    {
        1 => RiceCode.Decode(bytes, blockSize, samples),
        2 => RiceCode.Decode(bytes, blockSize, MemoryMarshal.Cast<byte, short>(samples)),
        _ => RiceCode.Decode(bytes, blockSize, MemoryMarshal.Cast<byte, int>(samples)),
    };

    /// <summary>Bytes have no sign, wider integers have one.</summary>
    private static void Widen(ReadOnlySpan<byte> narrow, int width, bool isBigEndian, Span<int> integers)
    {
        for (int i = 0; i < integers.Length; i++)
        {
            ReadOnlySpan<byte> sample = narrow.Slice(i * width, width);
            integers[i] = (width, isBigEndian) switch
            {
                (1, _) => sample[0],
                (2, true) => BinaryPrimitives.ReadInt16BigEndian(sample),
                (2, false) => BinaryPrimitives.ReadInt16LittleEndian(sample),
                (_, true) => BinaryPrimitives.ReadInt32BigEndian(sample),
                _ => BinaryPrimitives.ReadInt32LittleEndian(sample),
            };
        }
    }

    /// <summary>Integers as samples of an integer type, before its sign convention.</summary>
    private static string? Narrow(SampleType type, ReadOnlySpan<int> integers, Span<byte> stored) => (type.IsInteger(), type.Size()) switch
    {
        (true, 1) => Narrow(integers, stored),
        (true, 2) => Narrow(integers, MemoryMarshal.Cast<byte, short>(stored)),
        (true, 4) => Narrow(integers, MemoryMarshal.Cast<byte, int>(stored)),
        (true, _) => Narrow(integers, MemoryMarshal.Cast<byte, long>(stored)),
        _ => "it holds integers, and nothing says how they became floating-point samples",
    };

    private static string? Narrow<T>(ReadOnlySpan<int> integers, Span<T> samples)
        where T : unmanaged, IBinaryInteger<T>
    {
        for (int i = 0; i < integers.Length; i++)
        {
            samples[i] = T.CreateTruncating(integers[i]);
            if (int.CreateTruncating(samples[i]) != integers[i])
                return string.Create(CultureInfo.InvariantCulture, $"sample {i} is {integers[i]}, which does not fit ZBITPIX");
        }

        return null;
    }
}
