namespace Stacks.Abstractions;

/// <summary>value = zero + scale * stored. A negative scale swaps bright and dark.</summary>
/// <param name="Scale">Value units per stored unit; finite and not 0.</param>
/// <param name="Zero">The value of stored 0.</param>
public readonly record struct ValueTransform(double Scale, double Zero)
{
    /// <summary>Stored samples are values.</summary>
    public static ValueTransform Identity { get; } = new(1, 0);

    /// <summary>True when stored samples are values.</summary>
    public bool IsIdentity => Scale == 1 && Zero == 0;

    /// <summary>zero + scale * stored.</summary>
    public double ToValue(double stored) => Zero + Scale * stored;

    /// <summary>(value - zero) / scale, not rounded.</summary>
    public double ToStored(double value) => (value - Zero) / Scale;
}
