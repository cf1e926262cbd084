using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.TestPlugin;

/// <summary>y(x, y) = v(width - 1 - x, y), or the same along y: the smallest step that must see the whole frame.</summary>
public sealed class MirrorFilter : IFilterPlugin
{
    public string Id => "test-mirror";

    public string Summary => "Mirrors frames: y(x, y) = v(width - 1 - x, y)";

    public string Source => "textbook definition";

    public FilterKind Kind => FilterKind.Smoothing;

    public Equivariance Equivariance => Equivariance.Affine;

    public bool NeedsNoise => false;

    public IReadOnlyList<ParameterSpec> Parameters { get; } =
    [
        new ParameterSpec
        {
            Name = "axis",
            Kind = ParameterKind.Choice,
            Words = ["x", "y"],
            Default = ParameterValue.Of("x"),
            Meaning = "Axis along which the order of samples is turned round",
            WhenRaised = "y turns columns instead of rows",
            WhenLowered = "x turns rows",
        },
        new ParameterSpec
        {
            Name = "least_width",
            Kind = ParameterKind.Integer,
            Unit = "px",
            Minimum = 1,
            Maximum = 100000,
            Default = ParameterValue.Of(1.0),
            Meaning = "Frames narrower than this are refused",
            WhenRaised = "more frames are refused",
            WhenLowered = "fewer frames are refused",
        },
    ];

    public IReadOnlyList<WorkType> WorkTypes { get; } = [WorkType.UInt16, WorkType.Int16, WorkType.Float32, WorkType.Float64];

    public IFilterStep Prepare(FrameLayout layout, WorkType workType, ParameterValues values)
    {
        if (layout.Width < values.Integer("least_width"))
        {
            throw new ParameterException("least_width",
                string.Create(CultureInfo.InvariantCulture, $"the frame is only {layout.Width} px wide"), "lower it");
        }

        bool alongY = values.Word("axis") == "y";
        return workType switch
        {
            WorkType.UInt16 => new MirrorStep<ushort>(alongY),
            WorkType.Int16 => new MirrorStep<short>(alongY),
            WorkType.Float32 => new MirrorStep<float>(alongY),
            _ => new MirrorStep<double>(alongY),
        };
    }
}

/// <summary>The working part.</summary>
internal sealed class MirrorStep<T>(bool alongY) : IFilterStep<T>
    where T : unmanaged
{
    public int? Reach => null;

    public long ScratchBytes => 0;

    public IReadOnlyList<ResolvedParameter> Resolved { get; } = [new("axis", alongY ? "y" : "x", "")];

    public void Apply(Plane<T> input, Plane<SampleFlags> flags, Plane<T> output, FrameContext context)
    {
        for (int y = 0; y < input.Height; y++)
        {
            input.Row(alongY ? input.Height - 1 - y : y).CopyTo(output.Row(y));
            if (!alongY)
                output.Row(y).Reverse();
        }
    }
}
