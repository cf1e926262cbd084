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

    private delegate void RowWork(int y, Span<T> row);

    /// <summary>Bits of vectors to compute with, 0 for none; results are the same bits.</summary>
    public int VectorBits { get; init; } = RealLanes.Widest;

    /// <summary>Sums that follow one on another: one, or the row sums, the rounds, R and the exchange.</summary>
    private int Passes => conserveFlux ? Rounds + 3 : 1;

    /// <inheritdoc/>
    public int? Reach => rangeSigma is null ? null : checked(Passes * Math.Max(kernel.RadiusX, kernel.RadiusY));

    /// <inheritdoc/>
    public unsafe long ScratchBytes =>
        ((long)kernel.Stride * kernel.Height * sizeof(T) * (conserveFlux ? 4 : 2)) + ((long)kernel.Height * 4 * sizeof(double)) + (8L * kernel.Stride * sizeof(double));

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

        Plane<T>? factors = conserveFlux ? Balance(planes, flags, context) : null;
        ForEachRow(context, (y, changes) =>
        {
            ReadOnlySpan<T> samples = input.Row(y);
            ReadOnlySpan<SampleFlags> known = flags.Row(y);
            Span<T> results = output.Row(y);
            if (factors is { } c)
            {
                RealLanes.Run<ExchangeSums<T>, T>(new(kernel, exponents, planes, c, y, changes), kernel.Width, VectorBits);
                ReadOnlySpan<T> own = planes.Inner(c, y);
                for (int x = 0; x < samples.Length; x++)
                    changes[x] *= own[x];
            }
            else
            {
                RealLanes.Run<PixelSums<T>, T>(new(kernel, exponents, planes, y, changes), kernel.Width, VectorBits);
            }

            for (int x = 0; x < samples.Length; x++)
                results[x] = GuideLevels.TakesPart(known[x]) ? samples[x] + changes[x] : samples[x];
        });
    }

    /// <summary>The c of the flux-conserving form, in a padded plane; 0 where pixels take no part.</summary>
    internal Plane<T> Balance(GuidedPlanes<T> planes, Plane<SampleFlags> flags, FrameContext context)
    {
        Plane<T> factors = context.Scratch.Rent<T>(kernel.Stride, kernel.Height), next = context.Scratch.Rent<T>(kernel.Stride, kernel.Height);
        factors.Samples.Clear();
        next.Samples.Clear();
        for (int y = 0; y < kernel.Height; y++)
        {
            Span<T> row = planes.Inner(factors, y);
            for (int x = 0; x < row.Length; x++)
                row[x] = GuideLevels.TakesPart(flags[x, y]) ? T.One : T.Zero;
        }

        for (int pass = 0; pass < Rounds + 2; pass++)
        {
            ForEachRow(context, (y, sums) =>
            {
                RealLanes.Run<FactorSums<T>, T>(new(kernel, exponents, planes, factors, y, sums), kernel.Width, VectorBits);
                ReadOnlySpan<T> own = planes.Inner(factors, y);
                Span<T> results = planes.Inner(next, y);
                for (int x = 0; x < own.Length; x++)
                {
                    T c = own[x];
                    if (c == T.Zero)
                        continue;
                    results[x] = pass <= Rounds
                        ? T.Sqrt(c / sums[x])
                        : c / T.Max(T.One, c * (sums[x] - c));
                }
            });
            (factors, next) = (next, factors);
        }

        return factors;
    }

    private void ForEachRow(FrameContext context, RowWork work) => context.Bands.ForEach(kernel.Height, (first, end) =>
    {
        Plane<T> sums = context.Scratch.Rent<T>(RealLanes.Padded(kernel.Width), 1);
        for (int y = first; y < end; y++)
        {
            context.Cancellation.ThrowIfCancellationRequested();
            work(y, sums.Row(0));
        }
    });
}
