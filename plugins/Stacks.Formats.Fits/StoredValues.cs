using System.Numerics;
using System.Runtime.InteropServices;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Values of a few stored samples, for the facts that headers hide in the data (an overscan's level).</summary>
internal static class StoredValues
{
    /// <summary>Adds the values of the samples that are neither BLANK nor NaN nor infinite.</summary>
    public static void AddValid(FrameLayout layout, ReadOnlySpan<byte> stored, List<double> values)
    {
        switch (layout.SampleType)
        {
            case SampleType.UInt8:
                Add<byte>(layout, stored, values);
                break;
            case SampleType.Int8:
                Add<sbyte>(layout, stored, values);
                break;
            case SampleType.UInt16:
                Add<ushort>(layout, stored, values);
                break;
            case SampleType.Int16:
                Add<short>(layout, stored, values);
                break;
            case SampleType.UInt32:
                Add<uint>(layout, stored, values);
                break;
            case SampleType.Int32:
                Add<int>(layout, stored, values);
                break;
            case SampleType.UInt64:
                Add<ulong>(layout, stored, values);
                break;
            case SampleType.Int64:
                Add<long>(layout, stored, values);
                break;
            case SampleType.Float32:
                Add<float>(layout, stored, values);
                break;
            default:
                Add<double>(layout, stored, values);
                break;
        }
    }

    private static void Add<T>(FrameLayout layout, ReadOnlySpan<byte> stored, List<double> values)
        where T : unmanaged, INumber<T>
    {
        foreach (T sample in MemoryMarshal.Cast<byte, T>(stored))
        {
            if (layout.Blank is { } blank && Int128.CreateChecked(sample) == blank)
                continue;
            double value = layout.Transform.ToValue(double.CreateChecked(sample));
            if (double.IsFinite(value))
                values.Add(value);
        }
    }
}
