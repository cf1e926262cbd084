using System.Globalization;
using System.Numerics;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// y_p = v_p + sum_q w_pq (v_q - v_p) / sum_q w_pq, w_pq = exp(-|p-q|^2 / 2 ss^2) exp(-(T_p - T_q)^2 / 2 k^2).
/// With <c>conserve_flux</c>, y_p = v_p + sum_q c_p w_pq c_q (v_q - v_p). The exact form sums pixel by pixel over a disc
/// of radius 4.5 ss; the fast one takes time independent of ss.
/// </summary>
public sealed class BilateralFilter : IFilterPlugin
{
    private const string SpatialSigma = "spatial_sigma";
    private const string RangeSigma = "range_sigma";
    private const string ConserveFlux = "conserve_flux";
    private const string Method = "method";
    private const string Tolerance = "tolerance";
    private const string MeanGradientWord = "mean-gradient";

    /// <summary>Least ss of the fast form, samples: below, the exact form is sooner done.</summary>
    private const double LeastFastSigma = 6;

    private const string Auto = "auto";
    private const string Exact = "exact";
    private const string Fast = "fast";

    /// <inheritdoc/>
    public string Id => "bilateral";

    /// <inheritdoc/>
    public string Summary =>
        "Averages neighbours that are near in place and in value: "
        + "y_p = v_p + sum_q w_pq (v_q - v_p) / sum_q w_pq, w_pq = exp(-|p-q|^2 / 2 ss^2) exp(-(T_p - T_q)^2 / 2 k^2); "
        + "flux is conserved in total, not source by source";

    /// <inheritdoc/>
    public string Source =>
        "Tomasi and Manduchi, ICCV 1998, 839; symmetric scaling after Milanfar, SIAM J. Imaging Sci. 6 (2013) 263";

    /// <inheritdoc/>
    public FilterKind Kind => FilterKind.Smoothing;

    /// <inheritdoc/>
    public Equivariance Equivariance => Equivariance.Affine;

    /// <inheritdoc/>
    public bool NeedsNoise => true;

    /// <inheritdoc/>
    public IReadOnlyList<ParameterSpec> Parameters { get; } =
    [
        new ParameterSpec
        {
            Name = SpatialSigma,
            Kind = ParameterKind.Number,
            Unit = "px",
            Default = ParameterValue.Of(1.5),
            Minimum = 0.1,
            Maximum = 200,
            AllowsPercent = true,
            Meaning = "Standard deviation ss of the Gaussian in space",
            WhenRaised = "less noise, more flux moved within and around small sources; the exact form's time grows with its square",
            WhenLowered = "more noise left, sources truer, the exact form faster",
        },
        new ParameterSpec
        {
            Name = RangeSigma,
            Kind = ParameterKind.Number,
            Unit = "noise sigmas",
            Default = ParameterValue.Of(2.5),
            Minimum = 0.01,
            Maximum = 1e9,
            Words = [MeanGradientWord],
            Meaning = "Standard deviation k of the Gaussian on value differences, measured through the noise model; "
                + "mean-gradient takes each frame's mean gradient magnitude",
            WhenRaised = "less noise, edges and faint sources blurred more",
            WhenLowered = "edges and faint sources kept, noise tails left standing",
        },
        new ParameterSpec
        {
            Name = ConserveFlux,
            Kind = ParameterKind.Switch,
            Default = ParameterValue.Of(true),
            Meaning = "Exchange between pixels with symmetric weights, so that the frame's total stays the same",
            WhenRaised = "the total is conserved and sources lose less; six passes instead of one",
            WhenLowered = "the textbook form: a little less noise, and sources lose flux",
        },
        new ParameterSpec
        {
            Name = Method,
            Kind = ParameterKind.Choice,
            Default = ParameterValue.Of(Auto),
            Words = [Auto, Exact, Fast],
            Meaning = "How the sums are taken: exact, pixel by pixel; fast, in a time independent of spatial_sigma, which must "
                + "be 6 px or more; auto, fast from there on where its grid fits in 1 GB, except for frames on so many range "
                + "levels that exact is sooner done. A frame whose T spans more than 45,000 range sigmas is filtered exactly in any case",
            WhenRaised = "fast: within tolerance of the sum over all pixels",
            WhenLowered = "exact: within 1e-4 range sigmas of it",
        },
        new ParameterSpec
        {
            Name = Tolerance,
            Kind = ParameterKind.Number,
            Unit = "range sigmas",
            Default = ParameterValue.Of(5e-4),
            Minimum = 2e-5,
            Maximum = 0.1,
            Meaning = "Largest error of the fast form against the sum over all pixels",
            WhenRaised = "from 5e-4 on coarser levels and grid, faster",
            WhenLowered = "below 5e-4 finer levels and grid, slower",
        },
    ];

    /// <inheritdoc/>
    public IReadOnlyList<WorkType> WorkTypes { get; } = [WorkType.Float32, WorkType.Float64];

    /// <inheritdoc/>
    public IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values)
    {
        ParameterValue spatial = values[SpatialSigma];
        double spatialSigma = spatial.Form == ParameterForm.Percent
            ? spatial.Number / 100 * Math.Sqrt(((double)layout.Width * layout.Width) + ((double)layout.Height * layout.Height))
            : spatial.Number / layout.Pitch;
        if (!(spatialSigma * layout.Pitch <= 200))
        {
            throw new ParameterException(
                SpatialSigma,
                string.Create(CultureInfo.InvariantCulture, $"{spatial} of this frame's diagonal is {spatialSigma * layout.Pitch:G4} px"),
                "give at most 200 px");
        }

        double? rangeSigma = values[RangeSigma].Form == ParameterForm.Word ? null : values.Number(RangeSigma);
        bool conserveFlux = values.Switch(ConserveFlux);
        string method = values.Word(Method);
        double tolerance = values.Number(Tolerance);
        SpatialGrid? grid = method == Exact || spatialSigma < LeastFastSigma ? null : SpatialGrid.Of(spatialSigma, tolerance, layout.Width, layout.Height);
        bool fast = grid is { IsHeld: true };
        if (method == Fast && !fast)
        {
            throw new ParameterException(
                Method,
                grid is null
                    ? string.Create(CultureInfo.InvariantCulture, $"fast is for a {SpatialSigma} of {LeastFastSigma} samples and more, here it is {spatialSigma:G4}")
                    : string.Create(CultureInfo.InvariantCulture, $"fast would need more than 1 GB for a frame of {layout.Width} x {layout.Height} at a {SpatialSigma} of {spatialSigma:G4} samples"),
                $"give {Auto} or {Exact}");
        }

        ResolvedParameter[] resolved =
        [
            new(SpatialSigma, spatialSigma.ToString("R", CultureInfo.InvariantCulture), "px"),
            new(RangeSigma, values[RangeSigma].ToString(), rangeSigma is null ? "" : "noise sigmas"),
            new(ConserveFlux, values[ConserveFlux].ToString(), ""),
            new(Method, fast ? Fast : Exact, ""),
            new(Tolerance, tolerance.ToString("R", CultureInfo.InvariantCulture), "range sigmas"),
        ];
        return workType == WorkType.Float64 ? Step<double>() : Step<float>();

        IFilterStep<T> Step<T>()
            where T : unmanaged, IBinaryFloatingPointIeee754<T>
        {
            BilateralStep<T> exact = new(new SpatialKernel(spatialSigma, layout.Width, layout.Height), rangeSigma, conserveFlux, resolved);
            return fast
                ? new FastBilateralStep<T>(
                    grid!, LevelWeights.Of(tolerance), rangeSigma, conserveFlux, method == Auto, exact, resolved)
                : exact;
        }
    }
}
