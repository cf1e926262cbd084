namespace Stacks.Imaging;

/// <summary>
/// The border rule of every window: the plane goes on reflected about its edge sample, <c>dcb|abcd|cba</c>, as often as
/// a window needs; an axis of one sample repeats it.
/// </summary>
public static class Reflection
{
    /// <summary>Place in [0, length) that stands for <paramref name="index"/>: the period is 2 (length - 1).</summary>
    /// <param name="index">Any place on the axis, also outside of the plane.</param>
    /// <param name="length">Samples on the axis, 1 or more.</param>
    public static int Index(int index, int length)
    {
        if ((uint)index < (uint)length)
            return index;
        if (length == 1)
            return 0;
        int period = 2 * (length - 1);
        int place = index % period;
        if (place < 0)
            place += period;
        return place < length ? place : period - place;
    }
}
