using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// Sixteen neighbouring range levels in single precision. A kernel written once over this gives the same bits at every
/// vector width: each level does the same IEEE 754 operations, and sums over levels run in one fixed tree.
/// </summary>
/// <typeparam name="TSelf">The implementing type.</typeparam>
internal interface ILevelLanes<TSelf>
    where TSelf : struct, ILevelLanes<TSelf>
{
    /// <summary>One number on every level.</summary>
    static abstract TSelf All(float value);

    /// <summary>Sixteen numbers from a place on.</summary>
    static abstract TSelf Load(ref float start, nint offset);

    /// <summary>Writes sixteen numbers from a place on.</summary>
    void Store(ref float start, nint offset);

    /// <summary>a b + c, rounded once.</summary>
    static abstract TSelf MultiplyAdd(TSelf a, TSelf b, TSelf c);

    /// <summary>Difference.</summary>
    static abstract TSelf operator -(TSelf a, TSelf b);

    /// <summary>Product.</summary>
    static abstract TSelf operator *(TSelf a, TSelf b);

    /// <summary>Sum over the levels: i and i + 8 first, then i + 4, i + 2, i + 1.</summary>
    float Sum();
}

/// <summary>512-bit form.</summary>
internal readonly struct LevelLanes512(Vector512<float> levels) : ILevelLanes<LevelLanes512>
{
    private readonly Vector512<float> levels = levels;

    public static LevelLanes512 All(float value) => new(Vector512.Create(value));

    public static LevelLanes512 Load(ref float start, nint offset) => new(Vector512.LoadUnsafe(ref Unsafe.Add(ref start, offset)));

    public void Store(ref float start, nint offset) => levels.StoreUnsafe(ref Unsafe.Add(ref start, offset));

    public static LevelLanes512 MultiplyAdd(LevelLanes512 a, LevelLanes512 b, LevelLanes512 c) =>
        new(Vector512.FusedMultiplyAdd(a.levels, b.levels, c.levels));

    public static LevelLanes512 operator -(LevelLanes512 a, LevelLanes512 b) => new(a.levels - b.levels);

    public static LevelLanes512 operator *(LevelLanes512 a, LevelLanes512 b) => new(a.levels * b.levels);

    public float Sum()
    {
        Vector256<float> eight = levels.GetLower() + levels.GetUpper();
        return LevelLanes128.SumOf(eight.GetLower() + eight.GetUpper());
    }
}

/// <summary>256-bit form: two vectors.</summary>
internal readonly struct LevelLanes256(Vector256<float> low, Vector256<float> high) : ILevelLanes<LevelLanes256>
{
    private readonly Vector256<float> low = low, high = high;

    public static LevelLanes256 All(float value) => new(Vector256.Create(value), Vector256.Create(value));

    public static LevelLanes256 Load(ref float start, nint offset) =>
        new(Vector256.LoadUnsafe(ref Unsafe.Add(ref start, offset)), Vector256.LoadUnsafe(ref Unsafe.Add(ref start, offset + 8)));

    public void Store(ref float start, nint offset)
    {
        low.StoreUnsafe(ref Unsafe.Add(ref start, offset));
        high.StoreUnsafe(ref Unsafe.Add(ref start, offset + 8));
    }

    public static LevelLanes256 MultiplyAdd(LevelLanes256 a, LevelLanes256 b, LevelLanes256 c) =>
        new(Vector256.FusedMultiplyAdd(a.low, b.low, c.low), Vector256.FusedMultiplyAdd(a.high, b.high, c.high));

    public static LevelLanes256 operator -(LevelLanes256 a, LevelLanes256 b) => new(a.low - b.low, a.high - b.high);

    public static LevelLanes256 operator *(LevelLanes256 a, LevelLanes256 b) => new(a.low * b.low, a.high * b.high);

    public float Sum()
    {
        Vector256<float> eight = low + high;
        return LevelLanes128.SumOf(eight.GetLower() + eight.GetUpper());
    }
}

/// <summary>128-bit form: four vectors.</summary>
internal readonly struct LevelLanes128(Vector128<float> a, Vector128<float> b, Vector128<float> c, Vector128<float> d)
    : ILevelLanes<LevelLanes128>
{
    private readonly Vector128<float> a = a, b = b, c = c, d = d;

    public static LevelLanes128 All(float value)
    {
        Vector128<float> all = Vector128.Create(value);
        return new(all, all, all, all);
    }

    public static LevelLanes128 Load(ref float start, nint offset) => new(
        Vector128.LoadUnsafe(ref Unsafe.Add(ref start, offset)),
        Vector128.LoadUnsafe(ref Unsafe.Add(ref start, offset + 4)),
        Vector128.LoadUnsafe(ref Unsafe.Add(ref start, offset + 8)),
        Vector128.LoadUnsafe(ref Unsafe.Add(ref start, offset + 12)));

    public void Store(ref float start, nint offset)
    {
        a.StoreUnsafe(ref Unsafe.Add(ref start, offset));
        b.StoreUnsafe(ref Unsafe.Add(ref start, offset + 4));
        c.StoreUnsafe(ref Unsafe.Add(ref start, offset + 8));
        d.StoreUnsafe(ref Unsafe.Add(ref start, offset + 12));
    }

    public static LevelLanes128 MultiplyAdd(LevelLanes128 x, LevelLanes128 y, LevelLanes128 z) => new(
        Vector128.FusedMultiplyAdd(x.a, y.a, z.a),
        Vector128.FusedMultiplyAdd(x.b, y.b, z.b),
        Vector128.FusedMultiplyAdd(x.c, y.c, z.c),
        Vector128.FusedMultiplyAdd(x.d, y.d, z.d));

    public static LevelLanes128 operator -(LevelLanes128 x, LevelLanes128 y) => new(x.a - y.a, x.b - y.b, x.c - y.c, x.d - y.d);

    public static LevelLanes128 operator *(LevelLanes128 x, LevelLanes128 y) => new(x.a * y.a, x.b * y.b, x.c * y.c, x.d * y.d);

    public float Sum() => SumOf(a + c + (b + d));

    /// <summary>The tree's last two steps.</summary>
    internal static float SumOf(Vector128<float> four)
    {
        Vector128<float> two = four + Vector128.Shuffle(four, Vector128.Create(2, 3, 0, 1));
        return two.ToScalar() + two.GetElement(1);
    }
}

/// <summary>The scalar form: level by level.</summary>
internal struct LevelLanes1 : ILevelLanes<LevelLanes1>
{
    private Sixteen levels;

    public static LevelLanes1 All(float value)
    {
        LevelLanes1 all = default;
        for (int i = 0; i < 16; i++)
            all.levels[i] = value;
        return all;
    }

    public static LevelLanes1 Load(ref float start, nint offset)
    {
        LevelLanes1 loaded = default;
        for (int i = 0; i < 16; i++)
            loaded.levels[i] = Unsafe.Add(ref start, offset + i);
        return loaded;
    }

    public readonly void Store(ref float start, nint offset)
    {
        for (int i = 0; i < 16; i++)
            Unsafe.Add(ref start, offset + i) = levels[i];
    }

    public static LevelLanes1 MultiplyAdd(LevelLanes1 a, LevelLanes1 b, LevelLanes1 c)
    {
        for (int i = 0; i < 16; i++)
            c.levels[i] = MathF.FusedMultiplyAdd(a.levels[i], b.levels[i], c.levels[i]);
        return c;
    }

    public static LevelLanes1 operator -(LevelLanes1 a, LevelLanes1 b)
    {
        for (int i = 0; i < 16; i++)
            a.levels[i] -= b.levels[i];
        return a;
    }

    public static LevelLanes1 operator *(LevelLanes1 a, LevelLanes1 b)
    {
        for (int i = 0; i < 16; i++)
            a.levels[i] *= b.levels[i];
        return a;
    }

    public readonly float Sum()
    {
        LevelLanes1 sums = this;
        for (int half = 8; half > 0; half /= 2)
        {
            for (int i = 0; i < half; i++)
                sums.levels[i] += sums.levels[i + half];
        }

        return sums.levels[0];
    }

    [InlineArray(16)]
    private struct Sixteen
    {
        private float first;
    }
}
