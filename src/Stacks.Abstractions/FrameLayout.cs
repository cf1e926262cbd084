namespace Stacks.Abstractions;

/// <summary>What a plane of a file is for. Only science frames are filtered.</summary>
public enum FrameRole
{
    /// <summary>Measured light: filtered.</summary>
    Science,

    /// <summary>Standard deviations or variances that go with a science frame: carried.</summary>
    ErrorPlane,

    /// <summary>Flags that go with a science frame: non-zero is missing; carried.</summary>
    QualityMask,

    /// <summary>A reduced copy for display: carried.</summary>
    Thumbnail,
}

/// <summary>The period of a colour-filter mosaic, in pixels; 1 x 1 where there is none.</summary>
/// <param name="PeriodX">Columns after which the filter pattern repeats, 1 or more.</param>
/// <param name="PeriodY">Rows after which the filter pattern repeats, 1 or more.</param>
public readonly record struct Lattice(int PeriodX, int PeriodY)
{
    /// <summary>Every pixel looks through the same filter.</summary>
    public static Lattice Single { get; } = new(1, 1);

    /// <summary>True when there is no mosaic.</summary>
    public bool IsSingle => PeriodX == 1 && PeriodY == 1;
}

/// <summary>Shape, sample type and meaning of one frame. Immutable; frames that are alike may share one instance.</summary>
public sealed record FrameLayout
{
    /// <summary>Samples in a row.</summary>
    public required int Width { get; init; }

    /// <summary>Rows.</summary>
    public required int Height { get; init; }

    /// <summary>Type of the stored samples, after the format's unsigned convention has been undone.</summary>
    public required SampleType SampleType { get; init; }

    /// <summary>From stored samples to values.</summary>
    public ValueTransform Transform { get; init; } = ValueTransform.Identity;

    /// <summary>The stored value that marks a missing sample; integer types only. NaN always marks one in floats.</summary>
    public Int128? Blank { get; init; }

    /// <summary>Quantisation step q in value units: |scale| for integers, 0 for floats, more where low bits are unused.</summary>
    public double QuantisationStep { get; init; }

    /// <summary>
    /// Stored value from which a sample is saturated: this or brighter, which is this or lower where the scale is
    /// negative. Null where nothing is known.
    /// </summary>
    public double? SaturationStored { get; init; }

    /// <summary>Colour-filter mosaic of the frame. A filter never sees one: the pipeline splits it first.</summary>
    public Lattice Lattice { get; init; } = Lattice.Single;

    /// <summary>
    /// Distance between neighbouring samples in pixels of the sensor: 1, or the period of the mosaic in a sub-lattice.
    /// A filter divides lengths given in pixels of the optics or the image (FWHM, spatial sigma) by it.
    /// </summary>
    public int Pitch { get; init; } = 1;

    /// <summary>Channel index from 0; null where the format has none.</summary>
    public int? Channel { get; init; }

    /// <summary>Channel name; null where the format has none.</summary>
    public string? ChannelName { get; init; }

    /// <summary>Index along z from 0; null where the format has none.</summary>
    public int? Z { get; init; }

    /// <summary>Index in time from 0; null where the format has none.</summary>
    public int? Time { get; init; }

    /// <summary>Name of the extension the frame stands in (<c>SCI,2</c>); null where the format has none.</summary>
    public string? Extension { get; init; }

    /// <summary>Unit of the values as the file states it; <c>ADU</c> where it states none.</summary>
    public string Unit { get; init; } = "ADU";

    /// <summary>Role of the frame.</summary>
    public FrameRole Role { get; init; } = FrameRole.Science;

    /// <summary>Samples in the frame.</summary>
    public long Length => (long)Width * Height;

    /// <summary>Bytes of the stored samples.</summary>
    public long StoredBytes => Length * SampleType.Size();

    /// <summary>
    /// The type filters compute in: integers of 8 and 16 bits with identity transform stay integers, floats of 16 and
    /// 32 bits with identity transform are <see cref="float"/>, all else is <see cref="double"/>.
    /// </summary>
    public WorkType WorkType => (Transform.IsIdentity, SampleType) switch
    {
        (true, SampleType.UInt8 or SampleType.UInt16) => WorkType.UInt16,
        (true, SampleType.Int8 or SampleType.Int16) => WorkType.Int16,
        (true, SampleType.Float16 or SampleType.Float32) => WorkType.Float32,
        _ => WorkType.Float64,
    };
}
