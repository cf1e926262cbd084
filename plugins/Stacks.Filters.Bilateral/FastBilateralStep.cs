using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The bilateral filter in a time that hardly depends on ss: w_pq is a sum over range levels of products of one factor of p
/// and one of q (Gaussians about the level), each level's sums in space run through a coarse grid, and levels of few
/// samples pair by pair. All weights are positive and symmetric, so that the flux-conserving form is that of
/// <see cref="BilateralStep{T}"/>. Weights are in single precision; changes are added to values in double, and what rounding
/// leaves of an exchange's total is taken back in equal parts.
/// </summary>
/// <param name="grid">Nodes in space.</param>
/// <param name="weights">Range levels.</param>
/// <param name="rangeSigma">k in noise sigmas; null for each frame's mean gradient.</param>
/// <param name="conserveFlux">Exchange between pixels.</param>
/// <param name="whereCheaper">Whether frames that the exact form filters sooner are left to it.</param>
/// <param name="exact">The exact form; it also filters frames whose T spans more levels than there are.</param>
/// <param name="resolved">Parameters.</param>
internal sealed class FastBilateralStep<T>(
    SpatialGrid grid, LevelWeights weights, double? rangeSigma, bool conserveFlux, bool whereCheaper, IFilterStep<T> exact, IReadOnlyList<ResolvedParameter> resolved)
    : IFilterStep<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const int Rounds = 3;

    /// <summary>Measured times of a pass, ns: the exact form's for each q; the fast one's for each sample, tile, and slot of a node.</summary>
    private const double ExactNeighbour = 0.14, FastSample = 20, FastTile = 600, FastSlot = 10;

    /// <summary>Bits of vectors to compute with, 0 for none; results are the same bits.</summary>
    public int VectorBits { get; init; } = RealLanes.Widest;

    /// <inheritdoc/>
    public int? Reach => null;

    /// <inheritdoc/>
    public long ScratchBytes => GuideLevels.Bytes(grid.Width, grid.Height) + LevelSlots.Bytes(grid.MostSlots) + Math.Max(
        exact.ScratchBytes,
        LevelFrame<T>.Bytes(grid) + (conserveFlux ? (long)sizeof(float) * grid.Width * grid.Height : 0));

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        double range = rangeSigma ?? MeanGradient.Of(input, flags, context);
        GuideLevels guide = new(grid.Width, grid.Height, context.Scratch);
        bool fits = guide.Fill(input, flags, 1 / (range * weights.Spacing), context);
        LevelSlots slots = new(grid, guide, weights.Count, context.Scratch);
        if (!fits || (whereCheaper && ExactIsCheaper(slots.Thick)))
        {
            context.Report?.Invoke("fast", 0);
            exact.Apply(input, flags, output, context);
            return;
        }

        context.Report?.Invoke("range_sigma", range);
        context.Report?.Invoke("fast", 1);
        LevelFrame<T> frame = new(grid, weights, guide, slots, input, context);
        Plane<float>? factors = VectorBits switch
        {
            512 => Apply<LevelLanes512>(frame, output, context),
            256 => Apply<LevelLanes256>(frame, output, context),
            128 => Apply<LevelLanes128>(frame, output, context),
            _ => Apply<LevelLanes1>(frame, output, context),
        };
        if (context.Report is not null)
            context.Report("estimated_error", ErrorEstimate.Of(frame, factors, output, range, context));
    }

    private bool ExactIsCheaper(int levels)
    {
        double samples = (double)grid.Width * grid.Height, tiles = (double)grid.TilesX * grid.TilesY, nodes = (double)grid.NodesX * grid.NodesY;
        double neighbours = Math.Min(Math.PI * Math.Pow(SpatialKernel.Cut * grid.Sigma, 2), samples), slots = levels + weights.Count + LevelWeights.Lanes;
        return samples * neighbours * ExactNeighbour < (samples * FastSample) + (tiles * FastTile) + (nodes * slots * FastSlot);
    }

    /// <summary>Filters the frame; returns c of the exchange form.</summary>
    private Plane<float>? Apply<TLanes>(LevelFrame<T> frame, Plane<T> output, FrameContext context)
        where TLanes : struct, ILevelLanes<TLanes>
    {
        if (!conserveFlux)
        {
            frame.Apply<Average, TLanes>(default, context, (y, weights, exchanges) =>
            {
                ReadOnlySpan<T> v = frame.Values.Row(y);
                Span<T> results = output.Row(y);
                for (int x = 0; x < v.Length; x++)
                    results[x] = weights[x] > 0 ? T.CreateTruncating(double.CreateTruncating(v[x]) + (exchanges[x] / weights[x])) : v[x];
            });
            return null;
        }

        Plane<float> factors = context.Scratch.Rent<float>(grid.Width, grid.Height);
        frame.Apply<RowSum, TLanes>(default, context, (y, sums, _) => FactorUpdates.Start(sums, factors.Row(y)));
        for (int round = 0; round < Rounds; round++)
            frame.Apply<Balanced, TLanes>(factors, context, (y, sums, _) => FactorUpdates.Balance(sums, factors.Row(y)));
        frame.Apply<Balanced, TLanes>(factors, context, (y, sums, _) => FactorUpdates.Clamp(sums, factors.Row(y)));
        Plane<double> totals = context.Scratch.Rent<double>(2, grid.Height);
        frame.Apply<Exchange, TLanes>(factors, context, (y, _, exchanges) =>
        {
            (double moved, double count) = (0, 0);
            ReadOnlySpan<float> c = factors.Row(y);
            for (int x = 0; x < c.Length; x++)
            {
                moved += (double)c[x] * exchanges[x];
                count += c[x] > 0 ? 1 : 0;
            }

            (totals[0, y], totals[1, y]) = (moved, count);
        });
        double rest = Mean(totals);
        context.Bands.ForEach(grid.Height, (first, end) =>
        {
            for (int y = first; y < end; y++)
            {
                ReadOnlySpan<T> v = frame.Values.Row(y);
                ReadOnlySpan<float> c = factors.Row(y), exchanges = frame.Exchanges.Row(y);
                Span<T> results = output.Row(y);
                for (int x = 0; x < v.Length; x++)
                    results[x] = c[x] > 0 ? T.CreateTruncating(double.CreateTruncating(v[x]) + (((double)c[x] * exchanges[x]) - rest)) : v[x];
            }
        });
        return factors;
    }

    /// <summary>What rounding leaves of a total that should be 0, for each sample that takes part: some 1e-8 of what moved.</summary>
    private static double Mean(Plane<double> totals)
    {
        (double sum, double count) = (0, 0);
        for (int y = 0; y < totals.Height; y++)
        {
            sum += totals[0, y];
            count += totals[1, y];
        }

        return count == 0 ? 0 : sum / count;
    }

    private readonly struct Average : IPassForm
    {
        public static bool Factors => false;

        public static bool Values => true;
    }

    private readonly struct RowSum : IPassForm
    {
        public static bool Factors => false;

        public static bool Values => false;
    }

    private readonly struct Balanced : IPassForm
    {
        public static bool Factors => true;

        public static bool Values => false;
    }

    private readonly struct Exchange : IPassForm
    {
        public static bool Factors => true;

        public static bool Values => true;
    }
}
