using System.Numerics;
using Stacks.Abstractions;
using Stacks.Noise;
using Xunit;

namespace Stacks.Tests.Noise;

/// <summary>Every rank against a sort.</summary>
public class RankSelectionTests
{
    private static readonly int[] Counts = new int[RankSelection.Counts];

    private static void AgreesWithSort<T>(T[] samples)
        where T : unmanaged, INumber<T>
    {
        T[] sorted = [.. samples];
        Array.Sort(sorted);
        for (int rank = 0; rank < samples.Length; rank++)
        {
            RankedSample<T> found = RankSelection.Select<T>(samples, [], SampleFlags.None, rank, Counts);
            Assert.Equal(sorted[rank], found.Value);
            Assert.Equal(samples.Count(s => s < sorted[rank]), found.Below);
            Assert.Equal(samples.Count(s => s == sorted[rank]), found.Equal);
        }
    }

    [Fact]
    public void Ranks_are_those_of_a_sort()
    {
        Random random = new(2);
        AgreesWithSort<ushort>([0, ushort.MaxValue, .. Enumerable.Range(0, 60).Select(_ => (ushort)random.Next(30))]);
        AgreesWithSort<short>([short.MinValue, short.MaxValue, 0, -1, .. Enumerable.Range(0, 60).Select(_ => (short)random.Next(-9, 9))]);
        AgreesWithSort<float>([0, -0f, float.MaxValue, float.MinValue, float.Epsilon, -float.Epsilon, .. Enumerable.Range(0, 60).Select(_ => random.NextSingle() - 0.5f)]);
        AgreesWithSort<double>([0, -0.0, double.MaxValue, double.MinValue, double.Epsilon, -1, .. Enumerable.Range(0, 60).Select(_ => 1e10 + random.NextDouble())]);
    }

    [Fact]
    public void The_median_is_the_middle_or_the_mean_of_the_two_middles()
    {
        Assert.Equal(3, RankSelection.Median<float>([9, 1, 3], new SampleFlags[3], SampleFlags.Missing, Counts));
        Assert.Equal(6, RankSelection.Median<float>([9, 1, 3, 20], new SampleFlags[4], SampleFlags.Missing, Counts));
        Assert.Equal(3.5, RankSelection.Median<ushort>([4, 1, 3, 20], new SampleFlags[4], SampleFlags.Missing, Counts));
        Assert.Equal(3, RankSelection.Median<ushort>([3, 1, 3, 20], new SampleFlags[4], SampleFlags.Missing, Counts));
        Assert.Equal(9, RankSelection.Median<double>([9, double.NaN], [SampleFlags.None, SampleFlags.Missing], SampleFlags.Missing, Counts));
        Assert.True(double.IsNaN(RankSelection.Median<double>([1], [SampleFlags.Missing], SampleFlags.Missing, Counts)));
    }
}
