using System.Numerics;
using System.Runtime.CompilerServices;

namespace Stacks.Imaging;

/// <summary>
/// Ranks of single k x k windows, each sorted by a network of its own (see <see cref="WindowNetworks.Window"/>), as many
/// neighbouring pixels at once as a vector has lanes. For few pixels or many ranks; <see cref="WindowQuantiles"/> shares
/// work between windows.
/// </summary>
public sealed class WindowRanks
{
    private const int VectorBytes = 64;

    private readonly Lazy<NetworkCode> network;
    private readonly int rankCount;

    /// <summary>Ranks of the windows of one side.</summary>
    /// <param name="side">Side k, odd, 1 or more.</param>
    /// <param name="ranks">Wanted ranks, 1 (lowest) to k * k, in the order of the results.</param>
    /// <exception cref="ArgumentOutOfRangeException">The side is not odd, or a rank is out of range.</exception>
    public WindowRanks(int side, params ReadOnlySpan<int> ranks)
    {
        ArgumentOutOfRangeException.ThrowIfNotEqual(side & 1, 1, nameof(side));
        foreach (int rank in ranks)
        {
            ArgumentOutOfRangeException.ThrowIfLessThan(rank, 1, nameof(ranks));
            ArgumentOutOfRangeException.ThrowIfGreaterThan(rank, side * side, nameof(ranks));
        }

        Side = side;
        rankCount = ranks.Length;
        int[] wanted = ranks.ToArray();
        network = new Lazy<NetworkCode>(() => WindowNetworks.Window(side, wanted));
    }

    /// <summary>Side k of the window.</summary>
    public int Side { get; }

    /// <summary>Most pixels that <c>At</c> computes at once.</summary>
    public static int Pixels<T>()
        where T : unmanaged => VectorBytes / Unsafe.SizeOf<T>();

    /// <summary>Ranks of the windows around <see cref="Pixels"/> neighbouring pixels, as if every sample took part.</summary>
    /// <param name="rows">The plane.</param>
    /// <param name="x">Column of the first; those beyond the plane have windows of reflected samples.</param>
    /// <param name="y">Row.</param>
    /// <param name="results">Receives, for each wanted rank in turn, a value for each pixel.</param>
    public void At<T>(ReflectedRows<T> rows, int x, int y, Span<T> results)
        where T : unmanaged, INumber<T> => At(rows, x, y, results, LaneWidths.Widest, NetworkForm.Adaptive);

    /// <summary>The same with vectors of a width.</summary>
    [SkipLocalsInit]
    internal unsafe void At<T>(ReflectedRows<T> rows, int x, int y, Span<T> results, LaneWidth width, NetworkForm form)
        where T : unmanaged, INumber<T>
    {
        int length = Pixels<T>() + Side - 1;
        ArgumentOutOfRangeException.ThrowIfLessThan(results.Length, rankCount * Pixels<T>(), nameof(results));
        T* memory = stackalloc T[Side * length];
        byte** pointers = stackalloc byte*[Side + 1];
        for (int row = 0; row < Side; row++)
        {
            T* samples = memory + (row * length);
            rows.Copy(x - (Side / 2), y - (Side / 2) + row, new Span<T>(samples, length));
            pointers[row] = (byte*)samples;
        }

        fixed (T* result = results)
        {
            pointers[Side] = (byte*)result;
            network.Value.For<T>(VectorBytes, width, form, 1).Row(pointers, VectorBytes);
        }
    }
}
