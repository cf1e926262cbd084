using System.Diagnostics;
using System.Globalization;

namespace Stacks.Benchmarks;

/// <summary>A speed of ours beside a reference's, both taken in this run on this machine.</summary>
/// <param name="Name">What is compared.</param>
/// <param name="Ours">Our time, seconds.</param>
/// <param name="Reference">The reference's time for the same work, seconds.</param>
/// <param name="Goal">Least ratio of speeds, reference's time / our time.</param>
internal sealed record Ratio(string Name, double Ours, double Reference, double Goal)
{
    private const int Rounds = 5;

    /// <summary>The two taken in turns, so that neither has the machine to itself on a good moment; the median of each.</summary>
    public static Ratio Of(string name, double goal, Action ours, Action reference)
    {
        ours();
        reference();
        double[] first = new double[Rounds], second = new double[Rounds];
        for (int i = 0; i < Rounds; i++)
        {
            first[i] = Time(ours);
            second[i] = Time(reference);
        }

        return new Ratio(name, Median(first), Median(second), goal);
    }

    /// <summary>A line, tab-separated: name, ours, reference, ratio, goal, met or below.</summary>
    public override string ToString()
    {
        double ratio = Reference / Ours;
        return string.Create(CultureInfo.InvariantCulture, $"{Name}\t{Ours * 1e3:F1} ms\t{Reference * 1e3:F1} ms\t{ratio:F2}\t{Goal:F2}\t{(ratio >= Goal ? "met" : "below")}");
    }

    private static double Time(Action action)
    {
        long start = Stopwatch.GetTimestamp();
        action();
        return Stopwatch.GetElapsedTime(start).TotalSeconds;
    }

    private static double Median(double[] times) => times.Order().ElementAt(times.Length / 2);
}
