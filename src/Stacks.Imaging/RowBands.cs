using Stacks.Abstractions;

namespace Stacks.Imaging;

/// <summary>Row bands on the calling thread alone.</summary>
public sealed class SerialBands : IRowBands
{
    /// <summary>The one instance; it has no state.</summary>
    public static SerialBands Instance { get; } = new();

    /// <inheritdoc/>
    public void ForEach(int height, Action<int, int> work) => work(0, height);
}

/// <summary>Row bands on several threads: one band for each, cut at even shares of the height.</summary>
/// <param name="threads">Threads to use, 1 or more.</param>
public sealed class ParallelBands(int threads) : IRowBands
{
    /// <inheritdoc/>
    public void ForEach(int height, Action<int, int> work)
    {
        int bands = Math.Min(threads, height);
        if (bands <= 1)
        {
            work(0, height);
            return;
        }

        Parallel.For(0, bands, new ParallelOptions { MaxDegreeOfParallelism = bands }, band =>
            work((int)((long)height * band / bands), (int)((long)height * (band + 1) / bands)));
    }
}
