namespace Stacks.Filters.LocalStatistics;

/// <summary>y = v - min(1, s2_noise / s2_local) (v - centre); Lee 1980. A window without variance leaves v.</summary>
internal static class Shrinkage
{
    /// <summary>Fewest samples of a window that say something of its variance; below, the pixel is left.</summary>
    public const int LeastCount = 3;

    /// <summary>y.</summary>
    /// <param name="value">v.</param>
    /// <param name="centre">Local mean or median.</param>
    /// <param name="noise">Variance of the noise at the centre's level.</param>
    /// <param name="local">Local variance.</param>
    public static double Of(double value, double centre, double noise, double local) =>
        local > 0 ? value - (Math.Min(1, noise / local) * (value - centre)) : value;
}
