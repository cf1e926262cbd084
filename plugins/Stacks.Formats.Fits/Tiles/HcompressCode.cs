using System.Buffers;
using System.Buffers.Binary;
using System.Numerics;

namespace Stacks.Formats.Fits.Tiles;

/// <summary>
/// The code HCOMPRESS_1 (FITS Standard 4.0, section 10.4.4; R. White, in "Digitised Optical Sky Surveys", 1992): the
/// coefficients of an H-transform, divided by a scale, bit plane after bit plane as quad trees with a fixed Huffman code;
/// then the signs of those that are not 0.
/// </summary>
internal static class HcompressCode
{
    private const int HeaderBytes = 25;
    private const int Magic = 0xDD99;
    private const int MostPlanes = 62;
    private const int LongestCode = 6;
    private const string EndsEarly = "it ends before its last coefficient";

    /// <summary>For each 6 bits that may follow, the node whose code they begin with, and its length.</summary>
    private static readonly (byte Node, int Length)[] Codes = MakeCodes(
        (1, "000"), (2, "001"), (4, "010"), (8, "011"), (3, "1000"), (5, "1001"), (10, "1010"), (12, "1011"), (15, "1100"),
        (6, "11010"), (7, "11011"), (9, "11100"), (11, "11101"), (13, "11110"), (0, "111110"), (14, "111111"));

    /// <summary>Decodes a tile.</summary>
    /// <param name="stream">The tile's bytes.</param>
    /// <param name="width">Pixels in a row of the tile.</param>
    /// <param name="smooth">Smooth the coefficients of a lossy tile, SMOOTH.</param>
    /// <param name="pixels">Receives the pixels, whole rows of them.</param>
    /// <returns>What is wrong with the stream; null when nothing is.</returns>
    public static string? Decode(ReadOnlySpan<byte> stream, int width, bool smooth, Span<int> pixels)
    {
        if (stream.Length < HeaderBytes || BinaryPrimitives.ReadUInt16BigEndian(stream) != Magic)
            return "it does not begin as HCOMPRESS_1 does";
        int height = pixels.Length / width;
        int statedHeight = BinaryPrimitives.ReadInt32BigEndian(stream[2..]), statedWidth = BinaryPrimitives.ReadInt32BigEndian(stream[6..]);
        if (statedWidth != width || statedHeight != height)
            return $"it says {statedWidth} x {statedHeight} pixels, the tile has {width} x {height}";
        int scale = BinaryPrimitives.ReadInt32BigEndian(stream[10..]);
        long sum = BinaryPrimitives.ReadInt64BigEndian(stream[14..]);
        ReadOnlySpan<byte> planes = stream.Slice(22, 3);
        if (planes.ContainsAnyExceptInRange((byte)0, (byte)MostPlanes))
            return $"it says that coefficients have more than {MostPlanes} bits";

        long[] rented = ArrayPool<long>.Shared.Rent(pixels.Length);
        try
        {
            Span<long> coefficients = rented.AsSpan(0, pixels.Length);
            coefficients.Clear();
            BitReader bits = new(stream[HeaderBytes..]);
            if (ReadMagnitudes(ref bits, planes, coefficients, width, height) is { } problem)
                return problem;
            bits.SkipToByte();
            for (int i = 0; i < coefficients.Length; i++)
            {
                if (coefficients[i] != 0 && bits.Take(1) != 0)
                    coefficients[i] = -coefficients[i];
            }

            if (bits.IsOverrun)
                return EndsEarly;
            coefficients[0] = sum;
            if (scale > 1)
            {
                foreach (ref long coefficient in coefficients)
                    coefficient *= scale;
            }

            HTransform.Invert(coefficients, width, height, smooth ? scale : 0);
            for (int i = 0; i < pixels.Length; i++)
            {
                pixels[i] = (int)coefficients[i];
                if (pixels[i] != coefficients[i])
                    return $"pixel {i} is {coefficients[i]}, which does not fit 32 bits";
            }

            return null;
        }
        finally
        {
            ArrayPool<long>.Shared.Return(rented);
        }
    }

    /// <summary>The four quadrants, each with its number of bit planes: sums, differences along x, along y, along both.</summary>
    private static string? ReadMagnitudes(ref BitReader bits, ReadOnlySpan<byte> planes, Span<long> coefficients, int width, int height)
    {
        int left = (width + 1) / 2, top = (height + 1) / 2;
        string? problem = ReadQuadrant(ref bits, planes[0], coefficients, width, left, top)
            ?? ReadQuadrant(ref bits, planes[1], coefficients[Math.Min(left, coefficients.Length)..], width, width / 2, top)
            ?? ReadQuadrant(ref bits, planes[1], coefficients[(width * top)..], width, left, height / 2)
            ?? ReadQuadrant(ref bits, planes[2], coefficients[Math.Min((width * top) + left, coefficients.Length)..], width, width / 2, height / 2);
        if (problem is not null)
            return problem;
        return bits.Take(4) == 0 ? null : "its bit planes do not end with a 0";
    }

    /// <summary>A quadrant of <paramref name="width"/> x <paramref name="height"/> coefficients, the highest bit plane first.</summary>
    private static string? ReadQuadrant(ref BitReader bits, int planes, Span<long> coefficients, int stride, int width, int height)
    {
        int blocksX = (width + 1) / 2, blocksY = (height + 1) / 2;
        byte[] rented = ArrayPool<byte>.Shared.Rent(Math.Max(1, blocksX * blocksY));
        try
        {
            Span<byte> blocks = rented.AsSpan(0, Math.Max(1, blocksX * blocksY));
            for (int plane = planes - 1; plane >= 0; plane--)
            {
                switch (bits.Take(4))
                {
                    case 0:
                        for (int i = 0; i < blocksX * blocksY; i++)
                            blocks[i] = (byte)bits.Take(4);
                        break;
                    case 15:
                        ReadTree(ref bits, blocks, width, height);
                        break;
                    default:
                        return $"bit plane {plane} is coded in no known way";
                }

                if (bits.IsOverrun)
                    return EndsEarly;
                AddPlane(blocks, coefficients, stride, width, height, plane);
            }
        }
        finally
        {
            ArrayPool<byte>.Shared.Return(rented);
        }

        return null;
    }

    /// <summary>The 4 bits of a node, by the code of <see cref="Codes"/>.</summary>
    private static byte TakeNode(ref BitReader bits)
    {
        bits.Fill();
        (byte node, int length) = Codes[(int)(bits.Ahead >> (64 - LongestCode))];
        bits.Skip(length);
        return node;
    }

    /// <summary>
    /// A quad tree from its root down to blocks of 2 x 2 coefficients: each node is 4 bits that say which of its quarters
    /// are not all 0, and only those have nodes of their own, which come in reversed order.
    /// </summary>
    private static void ReadTree(ref BitReader bits, Span<byte> nodes, int width, int height)
    {
        nodes[0] = TakeNode(ref bits);
        int levels = BitOperations.Log2((uint)Math.Max(1, Math.Max(width, height) - 1)) + 1;
        for (int level = levels - 1; level > 0; level--)
        {
            // At this level a node stands for 2^level x 2^level coefficients.
            int nodesX = ((width - 1) >> level) + 1, nodesY = ((height - 1) >> level) + 1;
            Spread(nodes, nodesX, nodesY);
            for (int i = (nodesX * nodesY) - 1; i >= 0; i--)
            {
                if (nodes[i] != 0)
                    nodes[i] = TakeNode(ref bits);
            }
        }
    }

    /// <summary>The bits of each node to its quarters, in place: from the last to the first, so that no node is overwritten before it is read.</summary>
    private static void Spread(Span<byte> nodes, int width, int height)
    {
        int parentsX = (width + 1) / 2;
        for (int y = height - 1; y >= 0; y--)
        {
            for (int x = width - 1; x >= 0; x--)
            {
                int parent = nodes[(y / 2 * parentsX) + (x / 2)];
                nodes[(y * width) + x] = (byte)((parent >> Quarter(x, y)) & 1);
            }
        }
    }

    /// <summary>The bit of a node that stands for the quarter at an even or odd place: 8 and 4 in the first row, 2 and 1 in the second.</summary>
    private static int Quarter(int x, int y) => 3 - (x & 1) - (2 * (y & 1));

    private static void AddPlane(ReadOnlySpan<byte> blocks, Span<long> coefficients, int stride, int width, int height, int plane)
    {
        int blocksX = (width + 1) / 2;
        for (int y = 0; y < height; y++)
        {
            for (int x = 0; x < width; x++)
                coefficients[(y * stride) + x] |= (long)((blocks[(y / 2 * blocksX) + (x / 2)] >> Quarter(x, y)) & 1) << plane;
        }
    }

    private static (byte Node, int Length)[] MakeCodes(params (byte Node, string Code)[] codes)
    {
        (byte, int)[] table = new (byte, int)[1 << LongestCode];
        foreach ((byte node, string code) in codes)
        {
            int free = LongestCode - code.Length;
            table.AsSpan(Convert.ToInt32(code, 2) << free, 1 << free).Fill((node, code.Length));
        }

        return table;
    }
}
