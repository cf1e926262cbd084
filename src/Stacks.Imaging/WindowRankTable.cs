namespace Stacks.Imaging;

/// <summary>
/// Which ranks the type-7 quantiles of a window need when up to a number of its samples take no part. Those are counted as
/// highest, so that the ranks of the others stay what they are.
/// </summary>
internal sealed class WindowRankTable
{
    /// <summary>Most samples without part that a kernel for full windows is extended to.</summary>
    public const int MostHoles = 2;

    private readonly int[] ranks;
    private readonly (int Result, double Fraction)[,] places;

    /// <summary>The table of one window.</summary>
    /// <param name="count">Samples of the full window.</param>
    /// <param name="probabilities">Probabilities.</param>
    /// <param name="mostHoles">Samples without part, at most.</param>
    public WindowRankTable(int count, double[] probabilities, int mostHoles)
    {
        places = new (int, double)[Math.Min(mostHoles, count - 1) + 1, probabilities.Length];
        bool[] wanted = new bool[count + 1];
        for (int holes = 0; holes < places.GetLength(0); holes++)
        {
            foreach (double probability in probabilities)
            {
                (int rank, double fraction) = Quantile.Position(count - holes, probability);
                wanted[rank] = true;
                if (fraction > 0)
                    wanted[rank + 1] = true;
            }
        }

        ranks = [.. Enumerable.Range(0, wanted.Length).Where(rank => wanted[rank])];
        for (int holes = 0; holes < places.GetLength(0); holes++)
        {
            for (int p = 0; p < probabilities.Length; p++)
            {
                (int rank, double fraction) = Quantile.Position(count - holes, probabilities[p]);
                places[holes, p] = (Array.IndexOf(ranks, rank), fraction);
            }
        }
    }

    /// <summary>The ranks, ascending.</summary>
    public ReadOnlySpan<int> Ranks => ranks;

    /// <summary>Holes that the table covers.</summary>
    public int Holes => places.GetLength(0) - 1;

    /// <summary>Index in <see cref="Ranks"/> of the rank at or below a quantile, and how far the quantile lies on the way to the next.</summary>
    public (int Result, double Fraction) this[int holes, int probability] => places[holes, probability];
}
