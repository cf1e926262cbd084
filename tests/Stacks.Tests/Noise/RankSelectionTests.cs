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

    /// <summary>Many samples go through fences taken from every n-th of them; where those mislead, and on plateaus, ranks are still those of a sort.</summary>
    [Fact]
    public void Ranks_among_many_are_those_of_a_sort()
    {
        Random random = new(3);
        AgreeWithSort(Many(_ => (ushort)(1000 + random.Next(40) + random.Next(40))));
        AgreeWithSort(Many(_ => (ushort)random.Next(1 << 16)));
        AgreeWithSort(Many(_ => (ushort)7));
        AgreeWithSort(Many(i => (ushort)(i % 10 < 7 ? 500 : random.Next(1 << 16))));
        AgreeWithSort(Many(i => (short)(i % 9 == 0 ? short.MinValue : random.Next(-50, 50))));
        AgreeWithSort(Many(i => (float)i));
        AgreeWithSort(Many(i => i % 9 == 0 ? -1e30f : random.NextSingle()));
        AgreeWithSort(Many(i => i % 2 == 0 ? 0.0 : random.NextDouble() - 0.5));
        AgreeWithSort(Many(i => (random.NextDouble() - 0.5) * Math.Pow(10, random.Next(-300, 300))));
    }

    private static T[] Many<T>(Func<int, T> sample) => [.. Enumerable.Range(0, 20011).Select(sample)];

    private static void AgreeWithSort<T>(T[] samples)
        where T : unmanaged, INumber<T>
    {
        SampleFlags[] flags = [.. samples.Select((_, i) => i % 37 == 5 ? SampleFlags.Missing : SampleFlags.Saturated)];
        foreach ((T[] those, SampleFlags[] told) in new[] { (samples, []), (samples, flags) })
        {
            T[] sorted = [.. those.Where((_, i) => told.Length == 0 || told[i] != SampleFlags.Missing)];
            Array.Sort(sorted);
            foreach (int rank in new[] { 0, 1, 17, sorted.Length / 10, sorted.Length / 4, sorted.Length / 2, sorted.Length - 40, sorted.Length - 1 })
            {
                RankedSample<T> found = RankSelection.Select<T>(those, told, SampleFlags.Missing, rank, Counts);
                Assert.Equal(sorted[rank], found.Value);
                Assert.Equal(sorted.Count(s => s < sorted[rank]), found.Below);
                Assert.Equal(sorted.Count(s => s == sorted[rank]), found.Equal);
            }
        }
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
