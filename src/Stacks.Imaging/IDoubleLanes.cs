namespace Stacks.Imaging;

/// <summary>
/// Neighbouring pixels of a row in double, one a lane. A kernel written once over this runs scalar (one lane) and at
/// every vector width, and gives the same bits: each lane does the same IEEE 754 operations in the same order.
/// </summary>
/// <typeparam name="TSelf">The implementing type.</typeparam>
public interface IDoubleLanes<TSelf>
    where TSelf : struct, IDoubleLanes<TSelf>
{
    /// <summary>Lanes.</summary>
    static abstract int Count { get; }

    /// <summary>One number in every lane.</summary>
    static abstract TSelf All(double value);

    /// <summary>The <see cref="Count"/> samples from a place on.</summary>
    static abstract TSelf Load(ref double start, nint offset);

    /// <summary>The <see cref="Count"/> samples from a place on.</summary>
    static abstract TSelf Load(ref float start, nint offset);

    /// <summary>Writes <see cref="Count"/> samples from a place on.</summary>
    void Store(ref double start, nint offset);

    /// <summary>Writes <see cref="Count"/> samples from a place on, rounded to nearest.</summary>
    void Store(ref float start, nint offset);

    /// <summary>The smaller in every lane; no lane is NaN.</summary>
    static abstract TSelf Min(TSelf a, TSelf b);

    /// <summary>True when a is at least b in every lane; a lane with NaN is not.</summary>
    static abstract bool AllAtLeast(TSelf a, TSelf b);

    /// <summary>Sum.</summary>
    static abstract TSelf operator +(TSelf a, TSelf b);

    /// <summary>Difference.</summary>
    static abstract TSelf operator -(TSelf a, TSelf b);

    /// <summary>Product.</summary>
    static abstract TSelf operator *(TSelf a, TSelf b);

    /// <summary>Quotient.</summary>
    static abstract TSelf operator /(TSelf a, TSelf b);
}

/// <summary>What is computed for neighbouring pixels of a row at once.</summary>
public interface IPixelKernel
{
    /// <summary>Computes the pixels from column <paramref name="x"/> on, as many as there are lanes.</summary>
    void At<TLanes>(int x)
        where TLanes : struct, IDoubleLanes<TLanes>;
}
