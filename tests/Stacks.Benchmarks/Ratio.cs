using System.Diagnostics;
using System.Globalization;

namespace Stacks.Benchmarks;

/// <summary>A time of ours beside a reference's, both taken in this run on this machine.</summary>
/// <param name="Name">What is compared, and with how many threads where it is not one.</param>
/// <param name="Ours">Our time, seconds.</param>
/// <param name="Reference">The reference's time for the same work, seconds.</param>
/// <param name="Goal">What the ratio should be.</param>
internal sealed record Ratio(string Name, double Ours, double Reference, Goal Goal)
{
    private const int Rounds = 5;
    private const double WarmUp = 0.4;
    private const double LeastRound = 0.02;
    private const double LongRound = 1;

    /// <summary>The two taken in turns, so that neither has the machine to itself on a good moment; the median of each.</summary>
    /// <param name="name">What is compared.</param>
    /// <param name="goal">Least ratio of speeds, or <see cref="Goal.AtMost"/> for a ratio of times.</param>
    /// <param name="ours">Our work, once.</param>
    /// <param name="reference">The reference's, once.</param>
    public static Ratio Of(string name, Goal goal, Action ours, Action reference)
    {
        int oursRepeats = Repeats(ours), referenceRepeats = Repeats(reference);
        int rounds = Time(ours, 1) + Time(reference, 1) > LongRound ? 3 : Rounds;
        double[] first = new double[rounds], second = new double[rounds];
        for (int i = 0; i < rounds; i++)
        {
            first[i] = Time(ours, oursRepeats);
            second[i] = Time(reference, referenceRepeats);
        }

        return new Ratio(name, Median(first), Median(second), goal);
    }

    /// <summary>Ours, the median of some rounds, beside a reference that was timed apart, such as a script of another language.</summary>
    public static Ratio Of(string name, Goal goal, Action ours, double reference) => new(name, TimeOf(ours), reference, goal);

    /// <summary>Seconds of one call: the median of some rounds, after warming up.</summary>
    public static double TimeOf(Action work)
    {
        int repeats = Repeats(work), rounds = Time(work, 1) > LongRound ? 3 : Rounds;
        return Median([.. Enumerable.Range(0, rounds).Select(_ => Time(work, repeats))]);
    }

    /// <summary>Says why rows are not there.</summary>
    public static void LeftOut(string rows, string reason) => Console.Error.WriteLine($"left out: {rows}: {reason}");

    /// <summary>A line, tab-separated: name, ours, reference, ratio, goal, met or below; shown where there is no goal.</summary>
    public override string ToString()
    {
        double ratio = Goal.OfTimes ? Ours / Reference : Reference / Ours;
        return string.Create(
            CultureInfo.InvariantCulture, $"{Name}\t{Milliseconds(Ours)}\t{Milliseconds(Reference)}\t{ratio:F2}\t{Goal}\t{(Goal == default ? "shown" : Goal.IsMetBy(ratio) ? "met" : "below")}");
    }

    private static string Milliseconds(double seconds) => string.Create(CultureInfo.InvariantCulture, $"{seconds * 1e3:G4} ms");

    /// <summary>Warms up, so that the compiler is done with it, and finds how many calls fill a round.</summary>
    private static int Repeats(Action work)
    {
        long start = Stopwatch.GetTimestamp();
        do
            work();
        while (Stopwatch.GetElapsedTime(start).TotalSeconds < WarmUp);
        return Math.Max(1, (int)(LeastRound / Time(work, 1)));
    }

    private static double Time(Action work, int repeats)
    {
        long start = Stopwatch.GetTimestamp();
        for (int i = 0; i < repeats; i++)
            work();
        return Stopwatch.GetElapsedTime(start).TotalSeconds / repeats;
    }

    private static double Median(double[] times) => times.Order().ElementAt(times.Length / 2);
}

/// <summary>What a ratio should be: at least so many times the reference's speed, or at most so many times its time.</summary>
/// <param name="Bound">The bound.</param>
/// <param name="OfTimes">The ratio is our time / the reference's, and should be at most the bound.</param>
internal readonly record struct Goal(double Bound, bool OfTimes)
{
    /// <summary>At least so many times the reference's speed.</summary>
    public static implicit operator Goal(double leastSpeed) => new(leastSpeed, false);

    /// <summary>At most so many times the reference's time.</summary>
    public static Goal AtMost(double time) => new(time, true);

    /// <summary>True when the ratio is good enough.</summary>
    public bool IsMetBy(double ratio) => OfTimes ? ratio <= Bound : ratio >= Bound;

    /// <inheritdoc/>
    public override string ToString() => this == default ? "none" : string.Create(CultureInfo.InvariantCulture, $"{(OfTimes ? "<=" : ">=")} {Bound:F2}");
}
