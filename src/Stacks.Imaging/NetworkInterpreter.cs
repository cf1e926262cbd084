using System.Runtime.CompilerServices;

namespace Stacks.Imaging;

/// <summary>
/// A network as a list of steps over places of memory, a place being used again when its value is no longer needed. The
/// form for a single lane, and for vectors as long as compiling does not pay.
/// </summary>
internal sealed class NetworkInterpreter
{
    private readonly Step[] steps;
    private readonly NetworkOutput[] outputs;
    private readonly int placeCount;

    /// <summary>Lays out a network.</summary>
    public NetworkInterpreter(MinMaxNetwork network)
    {
        IReadOnlyList<int> order = network.Schedule();
        int[] uses = new int[network.Nodes.Count];
        foreach (int value in order)
        {
            foreach (int operand in Operands(network.Nodes[value]))
                uses[operand]++;
        }

        foreach (NetworkOutput output in network.Outputs)
            uses[output.Value]++;

        Stack<int> free = new();
        int[] placeOf = new int[network.Nodes.Count];
        steps = new Step[order.Count];
        for (int i = 0; i < steps.Length; i++)
        {
            int value = order[i];
            NetworkNode node = network.Nodes[value];
            Step step = node.Operation == NetworkOperation.Input
                ? new Step(node.Operation, 0, node.A, node.B, node.C)
                : new Step(node.Operation, 0, placeOf[node.A], placeOf[node.B], 0);
            foreach (int operand in Operands(node))
            {
                if (--uses[operand] == 0)
                    free.Push(placeOf[operand]);
            }

            placeOf[value] = free.Count > 0 ? free.Pop() : placeCount++;
            steps[i] = step with { Place = placeOf[value] };
        }

        outputs = [.. network.Outputs.Select(o => o with { Value = placeOf[o.Value] })];
    }

    /// <summary>Computes a row of outputs.</summary>
    /// <param name="pointers">The memories the network names.</param>
    /// <param name="pitch">Bytes from one row to the next in every memory.</param>
    /// <param name="bytes">Bytes of a row to compute; a multiple of a vector's size.</param>
    [SkipLocalsInit]
    [MethodImpl(MethodImplOptions.AggressiveOptimization)]
    public unsafe void Run<T, TVector, TLanes>(byte** pointers, int pitch, nint bytes)
        where T : unmanaged
        where TVector : unmanaged
        where TLanes : ILanes<TVector>
    {
        TVector* places = stackalloc TVector[placeCount];
        for (nint x = 0; x < bytes; x += sizeof(TVector))
        {
            foreach (ref readonly Step step in steps.AsSpan())
            {
                places[step.Place] = step.Operation switch
                {
                    NetworkOperation.Input => Unsafe.ReadUnaligned<TVector>(pointers[step.A] + ((nint)step.B * pitch) + (step.C * sizeof(T)) + x),
                    NetworkOperation.WithoutNegativeZero => TLanes.WithoutNegativeZero(places[step.A]),
                    NetworkOperation.Minimum => TLanes.Min(places[step.A], places[step.B]),
                    _ => TLanes.Max(places[step.A], places[step.B]),
                };
            }

            foreach ((int place, int pointer, int row) in outputs)
                Unsafe.WriteUnaligned(pointers[pointer] + ((nint)row * pitch) + x, places[place]);
        }
    }

    private static int[] Operands(NetworkNode node) => node.Operation switch
    {
        NetworkOperation.Input => [],
        NetworkOperation.WithoutNegativeZero => [node.A],
        _ => [node.A, node.B],
    };

    private readonly record struct Step(NetworkOperation Operation, int Place, int A, int B, int C);
}
