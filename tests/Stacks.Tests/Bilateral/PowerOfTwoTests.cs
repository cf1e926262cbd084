using System.Numerics;
using Stacks.Imaging;
using Xunit;

namespace Stacks.Tests.Bilateral;

/// <summary>2^u beside Math.Pow of the platform.</summary>
public class PowerOfTwoTests
{
    [Fact]
    public void Float_errs_by_less_than_2e_7() => Check<float>(2e-7);

    [Fact]
    public void Double_errs_by_less_than_1e_8() => Check<double>(1e-8);

    private static void Check<T>(double largest)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        T[] exponents = [T.Zero, .. Enumerable.Range(1, 159_999).Select(i => T.CreateTruncating(-i * 123.9 / 160_000))];
        T[] scalar = Powers(exponents, 0);
        Assert.Equal(T.One, scalar[0]);
        for (int i = 0; i < exponents.Length; i++)
        {
            double exact = Math.Pow(2, double.CreateTruncating(exponents[i]));
            Assert.True(Math.Abs((double.CreateTruncating(scalar[i]) / exact) - 1) < largest, $"2^{exponents[i]}: {scalar[i]}");
        }

        foreach (int bits in new[] { 128, 256, 512 })
            Assert.Equal(scalar, Powers(exponents, bits));
        Assert.All(Powers([T.CreateTruncating(-1e36), .. exponents[1..16]], 512)[..1], p => Assert.InRange(double.CreateTruncating(p), 0, 1e-37));
    }

    private static T[] Powers<T>(T[] exponents, int bits)
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        T[] results = new T[exponents.Length];
        RealLanes.Run<Row<T>, T>(new Row<T>(exponents, results), bits);
        return results;
    }

    private readonly struct Row<T>(T[] exponents, T[] results) : IRealKernel<T>
        where T : unmanaged, IBinaryFloatingPointIeee754<T>
    {
        public void Compute<TLanes>()
            where TLanes : struct, IRealLanes<TLanes, T>
        {
            PowerOfTwo<TLanes, T> power = new();
            for (int x = 0; x < results.Length; x += TLanes.Count)
                power.Of(TLanes.Load(ref exponents[0], x)).Store(ref results[0], x);
        }
    }
}
