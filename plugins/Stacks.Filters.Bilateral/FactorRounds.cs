using System.Runtime.InteropServices;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>One symmetric round on a row: c = sqrt(c / (W c)); 0 stays 0.</summary>
/// <param name="factors">c.</param>
/// <param name="sums">W c.</param>
/// <param name="results">Receives the new c.</param>
internal readonly ref struct FactorRound<T>(ReadOnlySpan<T> factors, ReadOnlySpan<T> sums, Span<T> results) : IRealKernel<T>
    where T : unmanaged
{
    /// <summary>Less than W c of any pixel that takes part.</summary>
    private const double Least = 1e-30;

    private readonly ref T factors = ref MemoryMarshal.GetReference(factors);
    private readonly ref T sums = ref MemoryMarshal.GetReference(sums);
    private readonly ref T results = ref results[0];
    private readonly int width = results.Length;

    /// <inheritdoc/>
    public void Compute<TLanes>()
        where TLanes : struct, IRealLanes<TLanes, T>
    {
        for (int x = 0; x < width; x += TLanes.Count)
            TLanes.Sqrt(TLanes.Load(ref factors, x) / TLanes.Max(TLanes.Load(ref sums, x), TLanes.All(Least))).Store(ref results, x);
    }
}

/// <summary>
/// c min(1, 1 / R) on a row, R = c (W c - c) the off-diagonal row sum, taken larger by more than its rounding.
/// </summary>
/// <param name="factors">c.</param>
/// <param name="sums">W c.</param>
/// <param name="results">Receives the new c.</param>
internal readonly ref struct FactorLimit<T>(ReadOnlySpan<T> factors, ReadOnlySpan<T> sums, Span<T> results) : IRealKernel<T>
    where T : unmanaged
{
    private const double Rounding = 1 + 4e-6;

    private readonly ref T factors = ref MemoryMarshal.GetReference(factors);
    private readonly ref T sums = ref MemoryMarshal.GetReference(sums);
    private readonly ref T results = ref results[0];
    private readonly int width = results.Length;

    /// <inheritdoc/>
    public void Compute<TLanes>()
        where TLanes : struct, IRealLanes<TLanes, T>
    {
        for (int x = 0; x < width; x += TLanes.Count)
        {
            TLanes c = TLanes.Load(ref factors, x), others = c * (TLanes.Load(ref sums, x) - c) * TLanes.All(Rounding);
            (c / TLanes.Max(others, TLanes.All(1))).Store(ref results, x);
        }
    }
}
