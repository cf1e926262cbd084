namespace Stacks.Imaging;

/// <summary>
/// A data-oblivious network: samples go in, minima and maxima of two values follow, and some values come out. The same
/// operations whatever the samples, so that lanes can be pixels. A value is a number, given in the order of making;
/// equal operations are one value, and what no output depends on is never computed.
/// </summary>
internal sealed class MinMaxNetwork
{
    private readonly List<NetworkNode> nodes = [];
    private readonly Dictionary<NetworkNode, int> known = [];
    private readonly List<NetworkOutput> outputs = [];

    /// <summary>All values in the order of making; operands come before what they are used in.</summary>
    public IReadOnlyList<NetworkNode> Nodes => nodes;

    /// <summary>What comes out.</summary>
    public IReadOnlyList<NetworkOutput> Outputs => outputs;

    /// <summary>A sample: <paramref name="offset"/> samples into row <paramref name="row"/> of the memory of pointer <paramref name="pointer"/>.</summary>
    public int Input(int pointer, int row, int offset) => Value(new NetworkNode(NetworkOperation.Input, pointer, row, offset));

    /// <summary>The lower of two values.</summary>
    public int Minimum(int a, int b) => Value(new NetworkNode(NetworkOperation.Minimum, Math.Min(a, b), Math.Max(a, b), 0));

    /// <summary>The higher of two values.</summary>
    public int Maximum(int a, int b) => Value(new NetworkNode(NetworkOperation.Maximum, Math.Min(a, b), Math.Max(a, b), 0));

    /// <summary>A value, a negative zero as zero: of equal samples minima and maxima may be either.</summary>
    public int WithoutNegativeZero(int a) => Value(new NetworkNode(NetworkOperation.WithoutNegativeZero, a, a, 0));

    /// <summary>Lets a value come out as row <paramref name="row"/> of the memory of pointer <paramref name="pointer"/>.</summary>
    public void Output(int value, int pointer, int row) => outputs.Add(new NetworkOutput(value, pointer, row));

    /// <summary>The values that outputs depend on, each after its operands and close to its first use.</summary>
    public IReadOnlyList<int> Schedule()
    {
        List<int> order = [];
        bool[] done = new bool[nodes.Count];
        foreach (NetworkOutput output in outputs)
            Visit(output.Value, order, done);
        return order;
    }

    private void Visit(int value, List<int> order, bool[] done)
    {
        if (done[value])
            return;
        done[value] = true;
        NetworkNode node = nodes[value];
        if (node.Operation != NetworkOperation.Input)
        {
            Visit(node.A, order, done);
            Visit(node.B, order, done);
        }

        order.Add(value);
    }

    private int Value(NetworkNode node)
    {
        if (!known.TryGetValue(node, out int value))
        {
            value = nodes.Count;
            nodes.Add(node);
            known.Add(node, value);
        }

        return value;
    }
}

/// <summary>What a value of a network is.</summary>
internal enum NetworkOperation
{
    /// <summary>A sample.</summary>
    Input,

    /// <summary>The lower of two values.</summary>
    Minimum,

    /// <summary>The higher of two values.</summary>
    Maximum,

    /// <summary>A value, a negative zero as zero.</summary>
    WithoutNegativeZero,
}

/// <summary>A value: of values A and B, or the sample at pointer A, row B, offset C.</summary>
internal sealed record NetworkNode(NetworkOperation Operation, int A, int B, int C);

/// <summary>A value that comes out, and where.</summary>
internal sealed record NetworkOutput(int Value, int Pointer, int Row);
