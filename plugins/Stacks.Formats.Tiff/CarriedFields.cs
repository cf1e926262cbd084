using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Tiff;

/// <summary>The fields of a source page that its result carries, byte for byte: the result has the source's byte order.</summary>
internal static class CarriedFields
{
    /// <summary>True for fields that point to other directories (reduced copies, EXIF, GPS): what they point to is not carried.</summary>
    public static bool PointsBelow(ushort tag) =>
        tag is Tag.SubIfds or Tag.ExifDirectory or Tag.GpsDirectory or Tag.InteroperabilityDirectory;

    /// <summary>Reads the carried fields of a science page.</summary>
    /// <param name="file">The source.</param>
    /// <param name="directory">The page's directory.</param>
    /// <param name="typeChanged">True when the result has another sample type.</param>
    /// <param name="samplesChanged">True when any sample differs.</param>
    public static IEnumerable<OutputField> OfScience(TiffFile file, TiffDirectory directory, bool typeChanged, bool samplesChanged) =>
        directory.Fields
            .Where(f => !IsStructure(f.Tag) && !PointsBelow(f.Tag))
            .Where(f => !(typeChanged && DependsOnType(f.Tag)) && !(samplesChanged && IsStatistic(f.Tag)))
            .Select(f => Load(file, directory, f));

    /// <summary>Reads the carried fields of a thumbnail: all but the places of its image data.</summary>
    public static IEnumerable<OutputField> OfThumbnail(TiffFile file, TiffDirectory directory) =>
        directory.Fields
            .Where(f => f.Tag is not (Tag.StripOffsets or Tag.StripByteCounts or Tag.TileOffsets or Tag.TileByteCounts) && !PointsBelow(f.Tag))
            .Select(f => Load(file, directory, f));

    /// <summary>Fields that say how the image data are stored: the writer makes them anew.</summary>
    public static bool IsStructure(ushort tag) => tag
        is Tag.ImageWidth or Tag.ImageLength or Tag.BitsPerSample or Tag.Compression or Tag.FillOrder
        or Tag.StripOffsets or Tag.SamplesPerPixel or Tag.RowsPerStrip or Tag.StripByteCounts or Tag.PlanarConfiguration
        or Tag.FreeOffsets or Tag.FreeByteCounts or Tag.Predictor or Tag.ColorMap
        or Tag.TileWidth or Tag.TileLength or Tag.TileOffsets or Tag.TileByteCounts
        or Tag.SampleFormat or Tag.JpegTables or (>= Tag.OldJpegFirst and <= Tag.OldJpegLast);

    private static bool IsStatistic(ushort tag) =>
        tag is Tag.MinSampleValue or Tag.MaxSampleValue or Tag.SMinSampleValue or Tag.SMaxSampleValue;

    private static bool DependsOnType(ushort tag) =>
        IsStatistic(tag) || tag is Tag.GrayResponseUnit or Tag.GrayResponseCurve or Tag.TransferFunction;

    private static OutputField Load(TiffFile file, TiffDirectory directory, TiffField field)
    {
        if (field.ByteLength > Array.MaxLength)
            throw new StackFormatException($"{directory.Where}, tag {field.Tag}", string.Create(CultureInfo.InvariantCulture, $"a value of {field.ByteLength} bytes is too long to carry"), "remove it from the source");
        byte[] value = new byte[field.ByteLength];
        file.Read(field.ValueAt, value);
        return new OutputField(field.Tag, field.Type, field.Count, value);
    }
}
