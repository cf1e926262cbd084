using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>From the header of an image to the layout that its planes share.</summary>
internal static class ImageLayout
{
    private const string Repair = "repair the header or get the file again";

    /// <summary>The layout of an image of two and more axes.</summary>
    /// <exception cref="StackFormatException">The scaling is broken, or a plane is larger than memory can address.</exception>
    public static FrameLayout Read(Hdu hdu, FitsHeader header)
    {
        if (hdu.Axes[0] > int.MaxValue || hdu.Axes[1] > int.MaxValue || hdu.PlaneBytes > Array.MaxLength)
            throw new StackFormatException(hdu.Where, $"a frame of {hdu.Axes[0]} x {hdu.Axes[1]} samples is larger than 2 GiB", "cut the image into smaller ones");

        (SampleType type, ValueTransform transform) = ReadScaling(hdu, header);
        return new FrameLayout
        {
            Width = (int)hdu.Axes[0],
            Height = (int)hdu.Axes[1],
            SampleType = type,
            Transform = transform,
            Blank = ReadBlank(type, header),
            QuantisationStep = type.IsInteger() ? Math.Abs(transform.Scale) : 0,
            SaturationStored = ReadSaturation(type, transform, header),
            Lattice = MosaicPattern.Read(header),
            Extension = hdu.Index == 0 && hdu.Name is null ? null : hdu.Label,
            Unit = header.Find("BUNIT")?.Trim() is { Length: > 0 } unit ? unit : "ADU",
            Role = hdu.Role switch
            {
                HduRole.ErrorPlane => FrameRole.ErrorPlane,
                HduRole.QualityMask => FrameRole.QualityMask,
                _ => FrameRole.Science,
            },
        };
    }

    /// <summary>Type and transform: BZERO alone, of exactly the value of a sign convention, is no scaling but a type.</summary>
    private static (SampleType Type, ValueTransform Transform) ReadScaling(Hdu hdu, FitsHeader header)
    {
        double scale = header.OwnNumber("BSCALE") ?? 1;
        double zero = header.OwnNumber("BZERO") ?? 0;
        if (scale == 0)
            throw new StackFormatException($"{hdu.Where}, keyword BSCALE", "0 makes every value the same", Repair);

        SampleType shifted = SampleEncoding.ShiftedType(hdu.BitPix);
        Int128 shift = SampleEncoding.Shift(shifted);
        return scale == 1 && shift != 0 && zero == (double)shift
            ? (shifted, ValueTransform.Identity)
            : (SampleEncoding.PlainType(hdu.BitPix), new ValueTransform(scale, zero));
    }

    /// <summary>BLANK is a value of the data unit: in a shifted type it is shifted like the samples. It means nothing for floats.</summary>
    private static Int128? ReadBlank(SampleType type, FitsHeader header) =>
        type.IsInteger() && header.OwnInteger("BLANK") is { } blank ? blank + SampleEncoding.Shift(type) : null;

    /// <summary>
    /// The keyword's value, or the bright end of the integer type where that comes first. 0 and below stand for "not
    /// known" (common practice).
    /// </summary>
    private static double? ReadSaturation(SampleType type, ValueTransform transform, FitsHeader header)
    {
        double? stated = CameraKeywords.SaturationKeywords.Select(header.FindNumber).FirstOrDefault(value => value > 0) is { } value
            ? transform.ToStored(value)
            : null;
        if (!type.IsInteger())
            return stated;
        return transform.Scale > 0
            ? Math.Min(stated ?? double.PositiveInfinity, type.Maximum())
            : Math.Max(stated ?? double.NegativeInfinity, type.Minimum());
    }

    /// <summary><c>300 x 200 x 5 uint16</c>.</summary>
    public static string Describe(Hdu hdu) => hdu.Layout is { } layout
        ? string.Create(CultureInfo.InvariantCulture, $"{hdu.Shape} {layout.SampleType.Name()}")
        : string.Create(CultureInfo.InvariantCulture, $"{hdu.Shape} BITPIX {hdu.BitPix}");
}
