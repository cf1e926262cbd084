namespace Stacks.Imaging;

/// <summary>
/// Neighbouring pixels of a row as real numbers, one a lane. A kernel written once over this runs scalar (one lane) and at
/// every vector width, and gives the same bits: each lane does the same IEEE 754 operations in the same order.
/// </summary>
/// <typeparam name="TSelf">The implementing type.</typeparam>
/// <typeparam name="T">float or double.</typeparam>
public interface IRealLanes<TSelf, T>
    where TSelf : struct, IRealLanes<TSelf, T>
    where T : unmanaged
{
    /// <summary>Lanes.</summary>
    static abstract int Count { get; }

    /// <summary>One number, rounded to <typeparamref name="T"/>, in every lane.</summary>
    static abstract TSelf All(double value);

    /// <summary>The <see cref="Count"/> samples from a place on.</summary>
    static abstract TSelf Load(ref T start, nint offset);

    /// <summary>One sample in every lane.</summary>
    static abstract TSelf Repeat(ref T start, nint offset);

    /// <summary>Writes <see cref="Count"/> samples from a place on.</summary>
    void Store(ref T start, nint offset);

    /// <summary>The larger in every lane; no lane is NaN.</summary>
    static abstract TSelf Max(TSelf a, TSelf b);

    /// <summary>a b + c, rounded once.</summary>
    static abstract TSelf MultiplyAdd(TSelf a, TSelf b, TSelf c);

    /// <summary>c - a b, rounded once.</summary>
    static abstract TSelf MultiplySubtract(TSelf a, TSelf b, TSelf c);

    /// <summary>The nearest whole number, ties to even.</summary>
    static abstract TSelf Round(TSelf a);

    /// <summary>a 2^n for whole n from -125 to 0.</summary>
    static abstract TSelf Scale(TSelf a, TSelf n);

    /// <summary>Square root.</summary>
    static abstract TSelf Sqrt(TSelf a);

    /// <summary>Sum.</summary>
    static abstract TSelf operator +(TSelf a, TSelf b);

    /// <summary>Difference.</summary>
    static abstract TSelf operator -(TSelf a, TSelf b);

    /// <summary>Product.</summary>
    static abstract TSelf operator *(TSelf a, TSelf b);

    /// <summary>Quotient.</summary>
    static abstract TSelf operator /(TSelf a, TSelf b);
}

/// <summary>What is computed in lanes.</summary>
/// <typeparam name="T">float or double.</typeparam>
public interface IRealKernel<T>
    where T : unmanaged
{
    /// <summary>Computes all of it, as many pixels at once as there are lanes.</summary>
    void Compute<TLanes>()
        where TLanes : struct, IRealLanes<TLanes, T>;
}
