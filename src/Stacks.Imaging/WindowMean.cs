using System.Runtime.InteropServices;

namespace Stacks.Imaging;

/// <summary>
/// How far the weighted mean of the k x k window around each pixel p of row <c>y</c> lies from the pixel itself:
/// sum_q w_q m_q (g_q - g_p) and sum_q w_q m_q, whose ratio is the mean minus g_p. Differences keep constants exact and
/// survive a large pedestal. Each sum runs row after row of the window, in double.
/// </summary>
/// <param name="values">g.</param>
/// <param name="masses">m: what each sample counts; 0 where it takes no part.</param>
/// <param name="weights">w, k * k of them, row after row.</param>
/// <param name="side">k, odd; at most 2 radius + 1 of the windows.</param>
/// <param name="y">Row of p.</param>
/// <param name="departures">Receives sum_q w_q m_q (g_q - g_p), one for each column.</param>
/// <param name="totals">Receives sum_q w_q m_q, one for each column.</param>
public readonly ref struct WindowMean(
    Windows<double> values, Windows<double> masses, ReadOnlySpan<double> weights, int side, int y, Span<double> departures, Span<double> totals)
    : IPixelKernel
{
    private readonly ref double corner = ref MemoryMarshal.GetReference(values.From(-(side / 2), y - (side / 2)));
    private readonly ref double massCorner = ref MemoryMarshal.GetReference(masses.From(-(side / 2), y - (side / 2)));
    private readonly ref double departures = ref departures[0];
    private readonly ref double totals = ref totals[0];
    private readonly ReadOnlySpan<double> weights = weights;
    private readonly int side = side;
    private readonly nint stride = values.Stride;

    /// <inheritdoc/>
    public void At<TLanes>(int x)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        TLanes own = TLanes.Load(ref corner, (side / 2 * (stride + 1)) + x);
        TLanes departure = TLanes.All(0), total = TLanes.All(0);
        for (int row = 0; row < side; row++)
        {
            nint q = (row * stride) + x;
            for (int i = row * side; i < (row + 1) * side; i++, q++)
            {
                TLanes w = TLanes.All(weights[i]) * TLanes.Load(ref massCorner, q);
                departure += w * (TLanes.Load(ref corner, q) - own);
                total += w;
            }
        }

        departure.Store(ref departures, x);
        total.Store(ref totals, x);
    }
}
