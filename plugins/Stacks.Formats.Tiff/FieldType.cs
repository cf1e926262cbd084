namespace Stacks.Formats.Tiff;

/// <summary>Types of a field's values (TIFF 6.0, section 2; 13 from its supplement 1; 16 to 18 from BigTIFF).</summary>
internal enum FieldType : ushort
{
    Byte = 1,
    Ascii = 2,
    Short = 3,
    Long = 4,
    Rational = 5,
    SByte = 6,
    Undefined = 7,
    SShort = 8,
    SLong = 9,
    SRational = 10,
    Float = 11,
    Double = 12,
    Ifd = 13,
    Long8 = 16,
    SLong8 = 17,
    Ifd8 = 18,
}

/// <summary>Facts about each <see cref="FieldType"/>.</summary>
internal static class FieldTypes
{
    /// <summary>Bytes of one value; 0 for a type this plugin does not know.</summary>
    public static int Size(this FieldType type) => type switch
    {
        FieldType.Byte or FieldType.Ascii or FieldType.SByte or FieldType.Undefined => 1,
        FieldType.Short or FieldType.SShort => 2,
        FieldType.Long or FieldType.SLong or FieldType.Float or FieldType.Ifd => 4,
        FieldType.Rational or FieldType.SRational or FieldType.Double or FieldType.Long8 or FieldType.SLong8 or FieldType.Ifd8 => 8,
        _ => 0,
    };

    /// <summary>True for the types in which counts, sizes and offsets are written.</summary>
    public static bool IsWholeNumber(this FieldType type) =>
        type is FieldType.Byte or FieldType.Short or FieldType.Long or FieldType.Ifd or FieldType.Long8 or FieldType.Ifd8;
}
