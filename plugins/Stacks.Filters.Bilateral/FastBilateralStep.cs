using System.Numerics;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The bilateral filter in a time that hardly depends on ss: w_pq is a sum over range levels of products of one factor of p
/// and one of q (Gaussians about the level), each level's sums in space run through a coarse grid, and levels of few
/// samples pair by pair. All weights are positive and symmetric, so that the flux-conserving form is that of
/// <see cref="BilateralStep{T}"/>. Weights are in single precision; changes are added to values in double.
/// </summary>
/// <param name="grid">Nodes in space.</param>
/// <param name="weights">Range levels.</param>
/// <param name="rangeSigma">k in noise sigmas; null for each frame's mean gradient.</param>
/// <param name="conserveFlux">Exchange between pixels.</param>
/// <param name="exact">What filters frames whose T spans more levels than there are.</param>
/// <param name="resolved">Parameters.</param>
internal sealed class FastBilateralStep<T>(
    SpatialGrid grid, LevelWeights weights, double? rangeSigma, bool conserveFlux, IFilterStep<T> exact, IReadOnlyList<ResolvedParameter> resolved)
    : IFilterStep<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const int Rounds = 3;

    /// <summary>Bits of vectors to compute with, 0 for none; results are the same bits.</summary>
    public int VectorBits { get; init; } = WidestVector;

    private static int WidestVector { get; } =
        System.Runtime.Intrinsics.Vector512.IsHardwareAccelerated ? 512
        : System.Runtime.Intrinsics.Vector256.IsHardwareAccelerated ? 256
        : System.Runtime.Intrinsics.Vector128.IsHardwareAccelerated ? 128
        : 0;

    /// <inheritdoc/>
    public int? Reach => null;

    /// <inheritdoc/>
    public long ScratchBytes => Math.Max(
        exact.ScratchBytes,
        GuideLevels.Bytes(grid.Width, grid.Height) + LevelFrame<T>.Bytes(grid) + (conserveFlux ? (long)sizeof(float) * grid.Width * grid.Height : 0));

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        double range = rangeSigma ?? MeanGradient.Of(input, flags, context);
        GuideLevels guide = new(grid.Width, grid.Height, context.Scratch);
        if (!guide.Fill(input, flags, 1 / (range * weights.Spacing), context))
        {
            context.Report?.Invoke("fast", 0);
            exact.Apply(input, flags, output, context);
            return;
        }

        context.Report?.Invoke("range_sigma", range);
        context.Report?.Invoke("fast", 1);
        LevelFrame<T> frame = new(grid, weights, guide, input, context);
        switch (VectorBits)
        {
            case 512:
                Apply<LevelLanes512>(frame, output, context);
                break;
            case 256:
                Apply<LevelLanes256>(frame, output, context);
                break;
            case 128:
                Apply<LevelLanes128>(frame, output, context);
                break;
            default:
                Apply<LevelLanes1>(frame, output, context);
                break;
        }
    }

    private void Apply<TLanes>(LevelFrame<T> frame, Plane<T> output, FrameContext context)
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
            return;
        }

        Plane<float> factors = context.Scratch.Rent<float>(grid.Width, grid.Height);
        frame.Apply<RowSum, TLanes>(default, context, (y, weights, _) =>
        {
            Span<float> c = factors.Row(y);
            for (int x = 0; x < c.Length; x++)
                c[x] = weights[x] > 0 ? 1 / MathF.Sqrt(weights[x]) : 0;
        });
        for (int round = 0; round < Rounds; round++)
        {
            frame.Apply<Balanced, TLanes>(factors, context, (y, weights, _) =>
            {
                Span<float> c = factors.Row(y);
                for (int x = 0; x < c.Length; x++)
                    c[x] = weights[x] > 0 ? MathF.Sqrt(c[x] / weights[x]) : 0;
            });
        }

        frame.Apply<Balanced, TLanes>(factors, context, (y, weights, _) =>
        {
            Span<float> c = factors.Row(y);
            for (int x = 0; x < c.Length; x++)
                c[x] /= Math.Max(1, c[x] * (weights[x] - c[x]));
        });
        frame.Apply<Exchange, TLanes>(factors, context, (y, _, exchanges) =>
        {
            ReadOnlySpan<T> v = frame.Values.Row(y);
            ReadOnlySpan<float> c = factors.Row(y);
            Span<T> results = output.Row(y);
            for (int x = 0; x < v.Length; x++)
                results[x] = c[x] > 0 ? T.CreateTruncating(double.CreateTruncating(v[x]) + ((double)c[x] * exchanges[x])) : v[x];
        });
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
