using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The bilateral filter on planes of one type, computed in that type from differences of samples. The flux-conserving form
/// scales w to c_p w_pq c_q: c starts at 1 / sqrt(row sum), three symmetric rounds c = sqrt(c / (W c)) (Sinkhorn; Knight,
/// Ruiz and Ucar, SIAM J. Matrix Anal. Appl. 35 (2014) 931) bring the row sums to 1, and one step c_p *= min(1, 1 / R_p),
/// R_p the off-diagonal row sum, keeps what a pixel retains of itself at 0 or more. What p gives q, q gets from p: w is
/// symmetric to the bit, so the total changes by rounding alone.
/// </summary>
internal sealed class BilateralStep<T>(
    SpatialKernel kernel, double? rangeSigma, bool conserveFlux, IReadOnlyList<ResolvedParameter> resolved)
    : IFilterStep<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const int Rounds = 3;

    private readonly T[] exponents = kernel.Exponents(T.CreateTruncating);

    /// <summary>Bits of vectors to compute with, 0 for none; results are the same bits.</summary>
    public int VectorBits { get; init; } = RealLanes.Widest;

    /// <summary>Sums that follow one on another: one, or the row sums, the rounds, R and the exchange.</summary>
    private int Passes => conserveFlux ? Rounds + 3 : 1;

    /// <inheritdoc/>
    public int? Reach => rangeSigma is null ? null : checked(Passes * Math.Max(kernel.RadiusX, kernel.RadiusY));

    /// <inheritdoc/>
    public unsafe long ScratchBytes =>
        ((long)kernel.Stride * kernel.PaddedHeight * sizeof(T) * (conserveFlux ? 4 : 2)) + ((long)kernel.Stride * (kernel.RadiusY + 4) * sizeof(T))
        + ((long)sizeof(double) * ((4 * kernel.Width) + (4 * kernel.Height)));

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        NoiseModel noise = context.Noise ?? throw new InvalidOperationException("the bilateral filter needs a noise model");
        double range = rangeSigma ?? MeanGradient.Of(input, flags, context);
        context.Report?.Invoke("range_sigma", range);
        double scale = Math.Sqrt(Math.Log2(Math.E) / 2) / range;
        if (double.IsInfinity(scale))
        {
            // A frame without gradient: only equal values would be averaged.
            input.Samples.CopyTo(output.Samples);
            return;
        }

        GuidedPlanes<T> planes = new(kernel, context.Scratch);
        double origin = noise.Stabilise(0, 0, GuidedPlanes<T>.Mean(input, flags, context));
        context.Bands.ForEach(kernel.Height, (first, end) =>
        {
            Plane<double> rows = context.Scratch.Rent<double>(kernel.Width, 2);
            for (int y = first; y < end; y++)
                planes.FillRow(y, input, flags, noise, origin, scale, rows);
        });

        if (conserveFlux)
        {
            Plane<T> factors = Balance(planes, flags, context);
            ForEachPairSum<OfChanges>(planes, factors, context, (y, sums) =>
            {
                ReadOnlySpan<T> own = planes.Inner(factors, y);
                for (int x = 0; x < own.Length; x++)
                    sums[x] *= own[x];
                AddTo(input.Row(y), flags.Row(y), sums, output.Row(y));
            });
            return;
        }

        context.Bands.ForEach(kernel.Height, (first, end) =>
        {
            Plane<T> changes = context.Scratch.Rent<T>(RealLanes.Padded(kernel.Width), 1);
            for (int y = first; y < end; y++)
            {
                context.Cancellation.ThrowIfCancellationRequested();
                RealLanes.Run<PixelSums<T>, T>(new(kernel, exponents, planes, y, changes.Row(0)), VectorBits);
                AddTo(input.Row(y), flags.Row(y), changes.Row(0), output.Row(y));
            }
        });
    }

    /// <summary>The c of the flux-conserving form, in a padded plane; 0 where pixels take no part.</summary>
    internal Plane<T> Balance(GuidedPlanes<T> planes, Plane<SampleFlags> flags, FrameContext context)
    {
        Plane<T> factors = context.Scratch.Rent<T>(kernel.Stride, kernel.PaddedHeight), next = context.Scratch.Rent<T>(kernel.Stride, kernel.PaddedHeight);
        factors.Samples.Clear();
        next.Samples.Clear();
        context.Bands.ForEach(kernel.Height, (first, end) =>
        {
            for (int y = first; y < end; y++)
            {
                Span<T> row = planes.Inner(factors, y);
                ReadOnlySpan<SampleFlags> known = flags.Row(y);
                for (int x = 0; x < known.Length; x++)
                    row[x] = GuideLevels.TakesPart(known[x]) ? T.One : T.Zero;
            }
        });

        for (int pass = 0; pass < Rounds + 2; pass++)
        {
            ForEachPairSum<OfFactors>(planes, factors, context, (y, sums) =>
            {
                ReadOnlySpan<T> own = planes.Inner(factors, y);
                Span<T> results = planes.Inner(next, y);
                for (int x = 0; x < own.Length; x++)
                    sums[x] += own[x];
                if (pass <= Rounds)
                    RealLanes.Run<FactorRound<T>, T>(new(own, sums, results), VectorBits);
                else
                    RealLanes.Run<FactorLimit<T>, T>(new(own, sums, results), VectorBits);
            });
            (factors, next) = (next, factors);
        }

        return factors;
    }

    /// <summary>
    /// Sums over the q around every p but p itself, row by row. A band begins with the rows before it that reach into it, so
    /// that its sums are added up in the same order wherever the frame is cut.
    /// </summary>
    private void ForEachPairSum<TTerm>(GuidedPlanes<T> planes, Plane<T> factors, FrameContext context, Action<int, Span<T>> finish)
        where TTerm : struct, IPairTerm => context.Bands.ForEach(kernel.Height, (first, end) =>
    {
        Plane<T> given = context.Scratch.Rent<T>(kernel.Stride, 2), taken = context.Scratch.Rent<T>(kernel.Stride, kernel.RadiusY + 2);
        taken.Samples.Clear();
        for (int y = Math.Max(0, first - kernel.RadiusY) & ~1; y < end; y += 2)
        {
            context.Cancellation.ThrowIfCancellationRequested();
            given.Samples.Clear();
            RealLanes.Run<PairSums<T, TTerm>, T>(new(kernel, exponents, planes, factors, y, given, taken), VectorBits);
            for (int row = 0; row < 2; row++)
            {
                Span<T> sums = planes.Inner(given, row);
                ReadOnlySpan<T> others = planes.Inner(taken, row);
                for (int x = 0; x < sums.Length; x++)
                    sums[x] += others[x];
                if (y + row >= first && y + row < end)
                    finish(y + row, sums);
            }

            taken.Samples[(2 * kernel.Stride)..].CopyTo(taken.Samples);
            taken.Samples[^(2 * kernel.Stride)..].Clear();
        }
    });

    private static void AddTo(ReadOnlySpan<T> samples, ReadOnlySpan<SampleFlags> flags, ReadOnlySpan<T> changes, Span<T> results)
    {
        for (int x = 0; x < samples.Length; x++)
            results[x] = GuideLevels.TakesPart(flags[x]) ? samples[x] + changes[x] : samples[x];
    }
}
