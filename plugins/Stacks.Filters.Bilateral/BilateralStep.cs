using System.Numerics;
using Stacks.Abstractions;
using Stacks.Imaging;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The bilateral filter on planes of one type; computed in double and rounded once, to the nearest <typeparamref
/// name="T"/>. The flux-conserving form scales w to c_p w_pq c_q: c starts at 1 / sqrt(row sum), three symmetric rounds
/// c = sqrt(c / (W c)) (Sinkhorn; Knight, Ruiz and Ucar, SIAM J. Matrix Anal. Appl. 35 (2014) 931) bring the row sums
/// to 1, and one step c_p *= min(1, 1 / R_p), R_p the off-diagonal row sum, keeps what a pixel retains of itself at
/// 0 or more. What p gives q, q gets from p: w is symmetric to the bit, so the total changes by rounding alone.
/// </summary>
internal sealed class BilateralStep<T>(
    SpatialKernel kernel, double? rangeSigma, bool conserveFlux, IReadOnlyList<ResolvedParameter> resolved)
    : IFilterStep<T>
    where T : unmanaged, IBinaryFloatingPointIeee754<T>
{
    private const int Rounds = 3;

    private delegate void RowWork(int y, Span<double> weights, Span<double> exchanges);

    /// <summary>Lanes to compute with; results are the same bits.</summary>
    public int Lanes { get; init; } = DoubleLanes.Widest;

    /// <summary>Sums that follow one on another: one, or the row sums, the rounds, R and the exchange.</summary>
    private int Passes => conserveFlux ? Rounds + 3 : 1;

    /// <inheritdoc/>
    public int? Reach => rangeSigma is null ? null : checked(Passes * Math.Max(kernel.RadiusX, kernel.RadiusY));

    /// <inheritdoc/>
    public long ScratchBytes => (long)kernel.Stride * kernel.Height * sizeof(double) * (conserveFlux ? 4 : 3);

    /// <inheritdoc/>
    public IReadOnlyList<ResolvedParameter> Resolved => resolved;

    /// <inheritdoc/>
    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        NoiseModel noise = context.Noise ?? throw new InvalidOperationException("the bilateral filter needs a noise model");
        GuidedPlanes planes = new(kernel, context.Scratch);
        ForEachRow(context, (y, _, _) => planes.FillRow(y, input, flags, noise));

        double range = rangeSigma ?? MeanGradient.Of(input, flags, context);
        context.Report?.Invoke("range_sigma", range);
        double perSquare = Math.Log2(Math.E) / (2 * range * range);
        if (double.IsInfinity(perSquare))
        {
            // A frame without gradient: only equal values would be averaged.
            input.Samples.CopyTo(output.Samples);
            return;
        }

        if (conserveFlux)
            planes = Balance(planes, perSquare, context);

        ForEachRow(context, (y, weights, exchanges) =>
        {
            DoubleLanes.Run(new PixelSums(kernel, planes, perSquare, y, weights, exchanges), kernel.Width, Lanes);
            ReadOnlySpan<double> values = planes.Inner(planes.Values, y), factors = planes.Inner(planes.Factors, y);
            ReadOnlySpan<T> samples = input.Row(y);
            Span<T> results = output.Row(y);
            for (int x = 0; x < samples.Length; x++)
            {
                double change = conserveFlux ? factors[x] * exchanges[x] : exchanges[x] / weights[x];
                results[x] = factors[x] == 0 ? samples[x] : T.CreateTruncating(values[x] + change);
            }
        });
    }

    /// <summary>Replaces c = 1 by the c of the flux-conserving form; pixels that take no part keep c = 0.</summary>
    internal GuidedPlanes Balance(GuidedPlanes planes, double perSquare, FrameContext context)
    {
        GuidedPlanes next = planes.With(context.Scratch.Rent<double>(kernel.Stride, kernel.Height));
        next.Factors.Samples.Clear();
        for (int pass = 0; pass < Rounds + 2; pass++)
        {
            ForEachRow(context, (y, weights, exchanges) =>
            {
                DoubleLanes.Run(new PixelSums(kernel, planes, perSquare, y, weights, exchanges), kernel.Width, Lanes);
                ReadOnlySpan<double> factors = planes.Inner(planes.Factors, y);
                Span<double> results = planes.Inner(next.Factors, y);
                for (int x = 0; x < factors.Length; x++)
                {
                    double c = factors[x];
                    if (c == 0)
                        continue;
                    results[x] = pass <= Rounds
                        ? Math.Sqrt(c / weights[x])
                        : c * Math.Min(1, 1 / (c * (weights[x] - c)));
                }
            });
            (planes, next) = (next, planes);
        }

        return planes;
    }

    private void ForEachRow(FrameContext context, RowWork work) => context.Bands.ForEach(kernel.Height, (first, end) =>
    {
        Plane<double> sums = context.Scratch.Rent<double>(kernel.Width, 2);
        for (int y = first; y < end; y++)
        {
            context.Cancellation.ThrowIfCancellationRequested();
            work(y, sums.Row(0), sums.Row(1));
        }
    });
}
