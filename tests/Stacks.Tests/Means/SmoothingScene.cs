using Stacks.Abstractions;
using Stacks.TestSupport;

namespace Stacks.Tests.Means;

/// <summary>A seeded plane with missing and saturated samples, and its windows by the border rule dcb|abcd|cba.</summary>
internal sealed class SmoothingScene
{
    public SmoothingScene(int width, int height, int seed, double missing = 0, double saturated = 0)
    {
        Random random = new(seed);
        Plane = FilterRun.PlaneOf(width, height, (_, _) => 50 + (200 * random.NextDouble()));
        Flags = FilterRun.Strike(Plane, random, missing, saturated);
    }

    public Plane<double> Plane { get; }

    public Plane<SampleFlags> Flags { get; }

    /// <summary>The window of a pixel, row after row: place in the window, value, flags.</summary>
    public IEnumerable<(int Place, double Value, SampleFlags Flags)> Window(int x, int y, int side)
    {
        int radius = side / 2, place = 0;
        for (int dy = -radius; dy <= radius; dy++)
        {
            for (int dx = -radius; dx <= radius; dx++, place++)
            {
                int column = Reflect(x + dx, Plane.Width), row = Reflect(y + dy, Plane.Height);
                yield return (place, Plane[column, row], Flags[column, row]);
            }
        }
    }

    /// <summary>Values of the window that are neither missing nor saturated.</summary>
    public double[] Sound(int x, int y, int side) => [.. Window(x, y, side).Where(w => w.Flags == SampleFlags.None).Select(w => w.Value)];

    private static int Reflect(int index, int length)
    {
        while (length > 1 && (index < 0 || index >= length))
            index = index < 0 ? -index : (2 * (length - 1)) - index;
        return length == 1 ? 0 : index;
    }
}
