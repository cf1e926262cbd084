using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// y_p = v_p + sum_q w_pq (v_q - v_p) / sum_q w_pq, w_pq = exp(-|p-q|^2 / 2 ss^2) exp(-(T_p - T_q)^2 / 2 k^2), in the
/// exact form: the sum reaches 4 ss along x and y. With <c>conserve_flux</c>, y_p = v_p + sum_q c_p w_pq c_q (v_q - v_p).
/// </summary>
public sealed class BilateralFilter : IFilterPlugin
{
    private const string SpatialSigma = "spatial_sigma";
    private const string RangeSigma = "range_sigma";
    private const string ConserveFlux = "conserve_flux";
    private const string MeanGradientWord = "mean-gradient";

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
            WhenRaised = "less noise, more flux moved within and around small sources; time grows with its square",
            WhenLowered = "more noise left, sources truer, faster",
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
        SpatialKernel kernel = new(spatialSigma, layout.Width, layout.Height);
        ResolvedParameter[] resolved =
        [
            new(SpatialSigma, spatialSigma.ToString("R", CultureInfo.InvariantCulture), "px"),
            new(RangeSigma, values[RangeSigma].ToString(), rangeSigma is null ? "" : "noise sigmas"),
            new(ConserveFlux, values[ConserveFlux].ToString(), ""),
        ];
        return workType == WorkType.Float64
            ? new BilateralStep<double>(kernel, rangeSigma, conserveFlux, resolved)
            : new BilateralStep<float>(kernel, rangeSigma, conserveFlux, resolved);
    }
}
