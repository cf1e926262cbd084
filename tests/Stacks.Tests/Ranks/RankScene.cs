using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Tests.Ranks;

/// <summary>Seeded planes with many ties, and the slow way to look at their windows.</summary>
internal sealed class RankScene<T>
    where T : unmanaged, INumber<T>
{
    /// <param name="width">Samples in a row.</param>
    /// <param name="height">Rows.</param>
    /// <param name="seed">Seed.</param>
    /// <param name="missing">Share of missing samples.</param>
    /// <param name="saturated">Share of saturated samples.</param>
    public RankScene(int width, int height, int seed, double missing = 0, double saturated = 0)
    {
        Random random = new(seed);
        Plane = new Plane<T>(new T[width * height], width, height);
        Flags = new Plane<SampleFlags>(new SampleFlags[width * height], width, height);
        int distinct = random.Next(2) == 0 ? 9 : 50_000;
        for (int i = 0; i < Plane.Length; i++)
        {
            double v = random.Next(distinct) - (typeof(T) == typeof(ushort) ? 0 : distinct / 2);
            bool isFloat = T.One / (T.One + T.One) != T.Zero;
            Plane.Buffer[i] = T.CreateSaturating(isFloat ? v / 7 : v);
            if (isFloat && v == 0 && random.Next(2) == 0)
                Plane.Buffer[i] = -Plane.Buffer[i];
            if (random.NextDouble() < missing)
            {
                Flags.Buffer[i] |= SampleFlags.Missing;
                if (isFloat)
                    Plane.Buffer[i] = T.CreateTruncating(double.NaN);
            }
            else if (random.NextDouble() < saturated)
            {
                Flags.Buffer[i] |= SampleFlags.Saturated;
            }
        }
    }

    public Plane<T> Plane { get; }

    public Plane<SampleFlags> Flags { get; }

    public ReflectedRows<T> Rows(int radius, SampleFlags without = SampleFlags.Missing) => new(Plane, Flags, without, radius, new Scratch());

    /// <summary>The samples of a window without those of any flag, in ascending order.</summary>
    public List<T> Sorted(int x, int y, int side, SampleFlags without = SampleFlags.Missing)
    {
        List<T> list = [];
        for (int j = y - (side / 2); j <= y + (side / 2); j++)
        {
            for (int i = x - (side / 2); i <= x + (side / 2); i++)
            {
                int column = Walk(i, Plane.Width), row = Walk(j, Plane.Height);
                if ((Flags[column, row] & without) == 0)
                    list.Add(Plane[column, row] + T.Zero);
            }
        }

        list.Sort();
        return list;
    }

    /// <summary>dcb|abcd|cba by walking to and fro.</summary>
    public static int Walk(int place, int length)
    {
        while (place < 0 || place >= length)
            place = length == 1 ? 0 : place < 0 ? -place : (2 * (length - 1)) - place;
        return place;
    }
}
