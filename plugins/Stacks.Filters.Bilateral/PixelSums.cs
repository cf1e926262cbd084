using System.Numerics;
using System.Runtime.CompilerServices;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The sums over q around every p of a row, with w_pq = 2^-((T_p - T_q)^2 range + place_q): sum_q w_pq c_q and
/// sum_q w_pq c_q (v_q - v_p). Each runs over q in the kernel's order, in double. Vector lanes are neighbouring p, so a
/// pixel gets the same bits in any lane and in the scalar form, which finishes the row.
/// </summary>
internal static class PixelSums
{
    /// <summary>Computes both sums for every p of row <paramref name="y"/>.</summary>
    /// <param name="kernel">The places q.</param>
    /// <param name="planes">T, v and c.</param>
    /// <param name="range">log2(e) / 2 k^2.</param>
    /// <param name="y">Row.</param>
    /// <param name="weights">Receives sum_q w_pq c_q, one for each column.</param>
    /// <param name="exchanges">Receives sum_q w_pq c_q (v_q - v_p), one for each column.</param>
    /// <param name="vectors">False to use the scalar form alone.</param>
    public static void OfRow(
        SpatialKernel kernel, GuidedPlanes planes, double range, int y, Span<double> weights, Span<double> exchanges, bool vectors)
    {
        (int first, int end) = kernel.PlacesOfRow(y);
        ReadOnlySpan<int> offsets = kernel.Offsets.AsSpan(first..end);
        ReadOnlySpan<double> places = kernel.Exponents.AsSpan(first..end);
        ref double values = ref planes.StartOfRow(planes.Values, y);
        ref double guide = ref planes.StartOfRow(planes.Guide, y);
        ref double factors = ref planes.StartOfRow(planes.Factors, y);
        int x = 0;
        if (vectors)
        {
            for (; x <= weights.Length - Vector<double>.Count; x += Vector<double>.Count)
            {
                Vector<double> ownValue = Vector.LoadUnsafe(ref Unsafe.Add(ref values, x));
                Vector<double> ownGuide = Vector.LoadUnsafe(ref Unsafe.Add(ref guide, x));
                Vector<double> weight = Vector<double>.Zero, exchange = Vector<double>.Zero;
                for (int i = 0; i < offsets.Length; i++)
                {
                    nint q = (nint)x + offsets[i];
                    Vector<double> apart = Vector.LoadUnsafe(ref Unsafe.Add(ref guide, q)) - ownGuide;
                    Vector<double> w = PowerOfTwo.Negative((apart * apart * range) + new Vector<double>(places[i]));
                    w *= Vector.LoadUnsafe(ref Unsafe.Add(ref factors, q));
                    weight += w;
                    exchange += w * (Vector.LoadUnsafe(ref Unsafe.Add(ref values, q)) - ownValue);
                }

                weight.CopyTo(weights[x..]);
                exchange.CopyTo(exchanges[x..]);
            }
        }

        for (; x < weights.Length; x++)
        {
            double ownValue = Unsafe.Add(ref values, x);
            double ownGuide = Unsafe.Add(ref guide, x);
            double weight = 0, exchange = 0;
            for (int i = 0; i < offsets.Length; i++)
            {
                nint q = (nint)x + offsets[i];
                double apart = Unsafe.Add(ref guide, q) - ownGuide;
                double w = PowerOfTwo.Negative((apart * apart * range) + places[i]);
                w *= Unsafe.Add(ref factors, q);
                weight += w;
                exchange += w * (Unsafe.Add(ref values, q) - ownValue);
            }

            weights[x] = weight;
            exchanges[x] = exchange;
        }
    }
}
