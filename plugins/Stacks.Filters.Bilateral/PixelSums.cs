using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The sums over q around every p of row <paramref name="y"/>, with w_pq = 2^-((T_p - T_q)^2 range + place_q):
/// sum_q w_pq c_q and sum_q w_pq c_q (v_q - v_p). Each runs over q in the kernel's order, in double.
/// </summary>
/// <param name="kernel">The places q.</param>
/// <param name="planes">T, v and c.</param>
/// <param name="range">log2(e) / 2 k^2.</param>
/// <param name="y">Row of p.</param>
/// <param name="weights">Receives sum_q w_pq c_q, one for each column.</param>
/// <param name="exchanges">Receives sum_q w_pq c_q (v_q - v_p), one for each column.</param>
internal readonly ref struct PixelSums(
    SpatialKernel kernel, GuidedPlanes planes, double range, int y, Span<double> weights, Span<double> exchanges) : IPixelKernel
{
    private readonly ReadOnlySpan<int> offsets = kernel.OffsetsOfRow(y);
    private readonly ReadOnlySpan<double> places = kernel.ExponentsOfRow(y);
    private readonly ref double values = ref planes.StartOfRow(planes.Values, y);
    private readonly ref double guide = ref planes.StartOfRow(planes.Guide, y);
    private readonly ref double factors = ref planes.StartOfRow(planes.Factors, y);
    private readonly ref double weights = ref weights[0];
    private readonly ref double exchanges = ref exchanges[0];
    private readonly double range = range;

    /// <inheritdoc/>
    public void At<TLanes>(int x)
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        TLanes ownValue = TLanes.Load(ref values, x), ownGuide = TLanes.Load(ref guide, x), scale = TLanes.All(range);
        TLanes weight = TLanes.All(0), exchange = TLanes.All(0);
        for (int i = 0; i < offsets.Length; i++)
        {
            nint q = (nint)x + offsets[i];
            TLanes apart = TLanes.Load(ref guide, q) - ownGuide;
            TLanes w = PowerOfTwo.Negative((apart * apart * scale) + TLanes.All(places[i])) * TLanes.Load(ref factors, q);
            weight += w;
            exchange += w * (TLanes.Load(ref values, q) - ownValue);
        }

        weight.Store(ref weights, x);
        exchange.Store(ref exchanges, x);
    }
}
