namespace Stacks.Abstractions;

/// <summary>The type of a stored sample, after the unsigned convention of its format has been undone.</summary>
public enum SampleType
{
    /// <summary>Unsigned 8-bit integer.</summary>
    UInt8,

    /// <summary>Signed 8-bit integer.</summary>
    Int8,

    /// <summary>Unsigned 16-bit integer.</summary>
    UInt16,

    /// <summary>Signed 16-bit integer.</summary>
    Int16,

    /// <summary>Unsigned 32-bit integer.</summary>
    UInt32,

    /// <summary>Signed 32-bit integer.</summary>
    Int32,

    /// <summary>Unsigned 64-bit integer.</summary>
    UInt64,

    /// <summary>Signed 64-bit integer.</summary>
    Int64,

    /// <summary>IEEE 754 binary16.</summary>
    Float16,

    /// <summary>IEEE 754 binary32.</summary>
    Float32,

    /// <summary>IEEE 754 binary64.</summary>
    Float64,
}

/// <summary>Facts about each <see cref="SampleType"/>.</summary>
public static class SampleTypes
{
    /// <summary>Size of one stored sample in bytes: 1, 2, 4 or 8.</summary>
    public static int Size(this SampleType type) => type switch
    {
        SampleType.UInt8 or SampleType.Int8 => 1,
        SampleType.UInt16 or SampleType.Int16 or SampleType.Float16 => 2,
        SampleType.UInt32 or SampleType.Int32 or SampleType.Float32 => 4,
        _ => 8,
    };

    /// <summary>True for the eight integer types.</summary>
    public static bool IsInteger(this SampleType type) => type < SampleType.Float16;

    /// <summary>Smallest stored value; negative infinity for floating-point types.</summary>
    public static double Minimum(this SampleType type) => type switch
    {
        SampleType.UInt8 or SampleType.UInt16 or SampleType.UInt32 or SampleType.UInt64 => 0,
        SampleType.Int8 => sbyte.MinValue,
        SampleType.Int16 => short.MinValue,
        SampleType.Int32 => int.MinValue,
        SampleType.Int64 => long.MinValue,
        _ => double.NegativeInfinity,
    };

    /// <summary>Largest stored value (rounded to double for 64-bit integers); infinity for floating-point types.</summary>
    public static double Maximum(this SampleType type) => type switch
    {
        SampleType.UInt8 => byte.MaxValue,
        SampleType.Int8 => sbyte.MaxValue,
        SampleType.UInt16 => ushort.MaxValue,
        SampleType.Int16 => short.MaxValue,
        SampleType.UInt32 => uint.MaxValue,
        SampleType.Int32 => int.MaxValue,
        SampleType.UInt64 => ulong.MaxValue,
        SampleType.Int64 => long.MaxValue,
        _ => double.PositiveInfinity,
    };

    /// <summary>The name used in recipes, plans and reports: <c>uint16</c>, <c>float32</c> and so on.</summary>
    public static string Name(this SampleType type) => type switch
    {
        SampleType.UInt8 => "uint8",
        SampleType.Int8 => "int8",
        SampleType.UInt16 => "uint16",
        SampleType.Int16 => "int16",
        SampleType.UInt32 => "uint32",
        SampleType.Int32 => "int32",
        SampleType.UInt64 => "uint64",
        SampleType.Int64 => "int64",
        SampleType.Float16 => "float16",
        SampleType.Float32 => "float32",
        _ => "float64",
    };
}
