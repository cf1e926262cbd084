using System.Collections.Concurrent;
using System.Numerics;
using System.Runtime.Intrinsics;

namespace Stacks.Imaging;

/// <summary>How a network is run. Results are the same bits in every form.</summary>
internal enum NetworkForm
{
    /// <summary>Interpreted until compiling pays, then compiled.</summary>
    Adaptive,

    /// <summary>Interpreted.</summary>
    Interpreted,

    /// <summary>Compiled.</summary>
    Compiled,
}

/// <summary>Runs a network on samples of any type at any vector width. Safe for concurrent use.</summary>
/// <param name="network">The network.</param>
/// <param name="pointerCount">Memories that it names.</param>
internal sealed class NetworkCode(MinMaxNetwork network, int pointerCount)
{
    /// <summary>The just-in-time compiler tracks 1,024 locals of a method; beyond, the interpreter is no slower.</summary>
    private const int LargestCompiled = 1000;

    /// <summary>Vectors of values to compute before compiling, which takes some 10 ms, is worth while.</summary>
    private const long CompileAfter = 4_000_000;

    private readonly NetworkInterpreter interpreter = new(network);
    private readonly int size = network.Schedule().Count;
    private readonly ConcurrentDictionary<(Type, LaneWidth, int), CompiledNetwork> compiled = new();
    private long interpreted;

    /// <summary>Makes the network ready to run with one pitch, at one vector width, on samples of one type.</summary>
    /// <param name="pitch">Bytes from one row to the next in every memory.</param>
    /// <param name="width">Vector width.</param>
    /// <param name="form">How it is run.</param>
    /// <param name="vectors">Vectors of results that will be computed, about: whether compiling pays.</param>
    public NetworkRun<T> For<T>(int pitch, LaneWidth width, NetworkForm form, long vectors)
        where T : unmanaged, INumber<T>
    {
        bool compile = width != LaneWidth.Single && size <= LargestCompiled && (form == NetworkForm.Compiled
            || (form == NetworkForm.Adaptive && Interlocked.Add(ref interpreted, vectors * size) >= CompileAfter));
        return new NetworkRun<T>(
            interpreter,
            compile ? Compiled<T>(pitch, width) : null,
            pitch,
            width);
    }

    private CompiledNetwork Compiled<T>(int pitch, LaneWidth width)
        where T : unmanaged =>
        compiled.TryGetValue((typeof(T), width, pitch), out CompiledNetwork? code) ? code : Compile<T>(pitch, width);

    private CompiledNetwork Compile<T>(int pitch, LaneWidth width)
        where T : unmanaged => compiled.GetOrAdd((typeof(T), width, pitch), NetworkCompiler.Compile<T>(network, pointerCount, pitch, width));
}

/// <summary>A network ready to run.</summary>
/// <typeparam name="T">ushort, short, float or double.</typeparam>
internal readonly struct NetworkRun<T>(NetworkInterpreter interpreter, CompiledNetwork? compiled, int pitch, LaneWidth width)
    where T : unmanaged, INumber<T>
{
    /// <summary>Computes a row of outputs.</summary>
    /// <param name="pointers">The memories the network names.</param>
    /// <param name="bytes">Bytes of a row to compute; a multiple of a vector's size.</param>
    public unsafe void Row(byte** pointers, int bytes)
    {
        if (compiled is not null)
            compiled(pointers, bytes);
        else if (width == LaneWidth.Bits512)
            interpreter.Run<T, Vector512<T>, Lanes512<T>>(pointers, pitch, bytes);
        else if (width == LaneWidth.Bits256)
            interpreter.Run<T, Vector256<T>, Lanes256<T>>(pointers, pitch, bytes);
        else if (width == LaneWidth.Bits128)
            interpreter.Run<T, Vector128<T>, Lanes128<T>>(pointers, pitch, bytes);
        else
            interpreter.Run<T, T, SingleLane<T>>(pointers, pitch, bytes);
    }
}
