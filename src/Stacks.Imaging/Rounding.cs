using System.Numerics;

namespace Stacks.Imaging;

/// <summary>From computed values to samples.</summary>
public static class Rounding
{
    /// <summary>The nearest sample: half to even in integer types, which hold at their ends.</summary>
    public static T ToSample<T>(double value)
        where T : unmanaged, INumber<T> =>
        typeof(T) == typeof(float) || typeof(T) == typeof(double)
            ? T.CreateTruncating(value)
            : T.CreateSaturating(Math.Round(value, MidpointRounding.ToEven));
}
