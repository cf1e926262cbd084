using System.Runtime.InteropServices;

namespace Stacks.Imaging;

/// <summary>
/// Mean and sum of squared deviations of the k x k window around each pixel p of row <c>y</c>, by two passes over the
/// window: mean = v_p + sum_q m_q (v_q - v_p) / n, then sum_q m_q (v_q - mean)^2, which keeps its digits whatever the
/// pedestal (Chan, Golub and LeVeque, The American Statistician 37 (1983) 242). Sample variance: divide by n - 1.
/// </summary>
/// <param name="values">v.</param>
/// <param name="masses">m: 1, or 0 where a sample takes no part.</param>
/// <param name="side">k, odd; at most 2 radius + 1 of the windows.</param>
/// <param name="y">Row of p.</param>
/// <param name="means">Receives the mean, one for each column; NaN where n is 0.</param>
/// <param name="squares">Receives the sum of squared deviations, one for each column.</param>
/// <param name="counts">Receives n, one for each column.</param>
public readonly ref struct WindowMoments(
    Windows<double> values, Windows<double> masses, int side, int y, Span<double> means, Span<double> squares, Span<double> counts)
    : IPixelKernel
{
    private readonly ref double corner = ref MemoryMarshal.GetReference(values.From(-(side / 2), y - (side / 2)));
    private readonly ref double massCorner = ref MemoryMarshal.GetReference(masses.From(-(side / 2), y - (side / 2)));
    private readonly ref double means = ref means[0];
    private readonly ref double squares = ref squares[0];
    private readonly ref double counts = ref counts[0];
    private readonly int side = side;
    private readonly nint stride = values.Stride;

    /// <inheritdoc/>
    public void At<TLanes>(int x)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        TLanes own = TLanes.Load(ref corner, (side / 2 * (stride + 1)) + x);
        TLanes departure = TLanes.All(0), count = TLanes.All(0);
        for (int row = 0; row < side; row++)
        {
            nint q = (row * stride) + x;
            for (int column = 0; column < side; column++, q++)
            {
                TLanes m = TLanes.Load(ref massCorner, q);
                departure += m * (TLanes.Load(ref corner, q) - own);
                count += m;
            }
        }

        TLanes mean = own + (departure / count), square = TLanes.All(0);
        for (int row = 0; row < side; row++)
        {
            nint q = (row * stride) + x;
            for (int column = 0; column < side; column++, q++)
            {
                TLanes apart = TLanes.Load(ref corner, q) - mean;
                square += TLanes.Load(ref massCorner, q) * (apart * apart);
            }
        }

        mean.Store(ref means, x);
        square.Store(ref squares, x);
        count.Store(ref counts, x);
    }
}
