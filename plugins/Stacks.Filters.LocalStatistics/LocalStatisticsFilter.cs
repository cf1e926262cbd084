using Stacks.Abstractions;

namespace Stacks.Filters.LocalStatistics;

/// <summary>
/// y = v - min(1, s2_noise / s2_local) (v - centre): flat places become their local centre, places that vary far more
/// than the noise stay. Form <c>mean</c>: local mean and variance. Form <c>robust</c>: median and (IQR / c)^2.
/// </summary>
public sealed class LocalStatisticsFilter : IFilterPlugin
{
    private const string Window = "window";
    private const string Form = "form";
    private const string MeanForm = "mean";
    private const string RobustForm = "robust";

    /// <inheritdoc/>
    public string Id => "local-statistics";

    /// <inheritdoc/>
    public string Summary =>
        "y = v - min(1, s2_noise / s2_local) (v - mean_local): smooths where the window holds noise alone, "
        + "leaves what varies far more";

    /// <inheritdoc/>
    public string Source => "Lee, IEEE Trans. Pattern Analysis and Machine Intelligence 2 (1980) 165";

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
            Name = Window,
            Kind = ParameterKind.OddInteger,
            Unit = "px",
            Default = ParameterValue.Of(7),
            Minimum = 3,
            Maximum = 31,
            Meaning = "Side of the square window that mean and variance are taken from",
            WhenRaised = "flat places become smoother, and the unsmoothed rim around sources and edges wider; slower",
            WhenLowered = "the rim becomes narrower, and the local variance less certain",
        },
        new ParameterSpec
        {
            Name = Form,
            Kind = ParameterKind.Choice,
            Default = ParameterValue.Of(MeanForm),
            Words = [MeanForm, RobustForm],
            Meaning = "mean: local mean and variance; robust: local median and (IQR / c)^2, c the IQR of that many unit normals",
            WhenRaised = "robust: a few impulses or faint stars in a window no longer decide it, and are smoothed away themselves",
            WhenLowered = "mean: follows every sample of the window, least noise on clean data",
        },
    ];

    /// <inheritdoc/>
    public IReadOnlyList<WorkType> WorkTypes { get; } = [WorkType.Float32, WorkType.Float64];

    /// <inheritdoc/>
    public IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values)
    {
        int side = values.Integer(Window);
        ResolvedParameter[] resolved = [new(Window, values[Window].ToString(), "px"), new(Form, values.Word(Form), "")];
        return (workType, values.Word(Form)) switch
        {
            (WorkType.Float64, MeanForm) => new MeanFormStep<double>(layout, side, resolved),
            (WorkType.Float64, _) => new RobustFormStep<double>(layout, side, resolved),
            (_, MeanForm) => new MeanFormStep<float>(layout, side, resolved),
            _ => new RobustFormStep<float>(layout, side, resolved),
        };
    }
}
