using System.Numerics;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// The steps to the factors c of the flux-conserving form, a row at a time, from sum_q w_pq c_q of the factors before; c is 0
/// where that is 0, for samples that take no part.
/// </summary>
internal static class FactorUpdates
{
    /// <summary>c = 1 / sqrt(row sum): the start.</summary>
    public static void Start(ReadOnlySpan<float> sums, Span<float> factors) =>
        Update(sums, factors, (sum, _) => Vector<float>.One / Vector.SquareRoot(sum));

    /// <summary>c = sqrt(c / (W c)): a symmetric round.</summary>
    public static void Balance(ReadOnlySpan<float> sums, Span<float> factors) =>
        Update(sums, factors, (sum, c) => Vector.SquareRoot(c / sum));

    /// <summary>c = c min(1, 1 / R), R = c (W c - c) the off-diagonal row sum: keeps self-weights at 0 or more.</summary>
    public static void Clamp(ReadOnlySpan<float> sums, Span<float> factors) =>
        Update(sums, factors, (sum, c) => c / Vector.Max(Vector<float>.One, c * (sum - c)));

    private static void Update(ReadOnlySpan<float> sums, Span<float> factors, Func<Vector<float>, Vector<float>, Vector<float>> rule)
    {
        int x = 0;
        for (; x <= sums.Length - Vector<float>.Count; x += Vector<float>.Count)
            Updated(new Vector<float>(sums[x..]), new Vector<float>(factors[x..]), rule).CopyTo(factors[x..]);
        if (x == sums.Length)
            return;

        Span<float> sum = stackalloc float[Vector<float>.Count], c = stackalloc float[Vector<float>.Count];
        sum.Clear();
        c.Clear();
        sums[x..].CopyTo(sum);
        factors[x..].CopyTo(c);
        Updated(new Vector<float>(sum), new Vector<float>(c), rule).CopyTo(c);
        c[..(sums.Length - x)].CopyTo(factors[x..]);
    }

    private static Vector<float> Updated(Vector<float> sum, Vector<float> c, Func<Vector<float>, Vector<float>, Vector<float>> rule) =>
        Vector.ConditionalSelect(Vector.GreaterThan(sum, Vector<float>.Zero), rule(sum, c), Vector<float>.Zero);
}
