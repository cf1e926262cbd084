using System.Reflection;
using System.Reflection.Emit;
using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;

namespace Stacks.Imaging;

/// <summary>A network made into machine code: one vector after another.</summary>
/// <param name="pointers">The memories the network names.</param>
/// <param name="bytes">Bytes of a row to compute; a multiple of the vector's size.</param>
internal unsafe delegate void CompiledNetwork(byte** pointers, nint bytes);

/// <summary>
/// Makes a loop over vectors of a <see cref="MinMaxNetwork"/>: straight-line code whose intermediate values the just-in-time
/// compiler keeps in registers as far as they go. It tracks 1,024 locals of a method, so a network should stay below
/// 1,000 values.
/// </summary>
internal static class NetworkCompiler
{
    /// <summary>Compiles a network.</summary>
    /// <typeparam name="T">ushort, short, float or double.</typeparam>
    /// <param name="network">The network.</param>
    /// <param name="pointerCount">Memories that it names.</param>
    /// <param name="pitch">Bytes from one row to the next in every memory.</param>
    /// <param name="width">Vector width, 128 to 512.</param>
    public static CompiledNetwork Compile<T>(MinMaxNetwork network, int pointerCount, int pitch, LaneWidth width)
        where T : unmanaged
    {
        (Type holder, Type vector) = width switch
        {
            LaneWidth.Bits128 => (typeof(Vector128), typeof(Vector128<T>)),
            LaneWidth.Bits256 => (typeof(Vector256), typeof(Vector256<T>)),
            LaneWidth.Bits512 => (typeof(Vector512), typeof(Vector512<T>)),
            _ => throw new ArgumentOutOfRangeException(nameof(width)),
        };
        MethodInfo minimum = holder.GetMethod(nameof(Vector512.MinNative))!.MakeGenericMethod(typeof(T));
        MethodInfo maximum = holder.GetMethod(nameof(Vector512.MaxNative))!.MakeGenericMethod(typeof(T));
        MethodInfo add = holder.GetMethod(nameof(Vector512.Add))!.MakeGenericMethod(typeof(T));
        MethodInfo zero = vector.GetProperty(nameof(Vector512<>.Zero))!.GetMethod!;
        bool isFloating = typeof(T) == typeof(float) || typeof(T) == typeof(double);
        DynamicMethod method = new("Network", typeof(void), [typeof(byte**), typeof(nint)], typeof(NetworkCompiler).Module, skipVisibility: true);
        ILGenerator code = method.GetILGenerator();

        LocalBuilder[] memories = new LocalBuilder[pointerCount];
        for (int i = 0; i < pointerCount; i++)
        {
            memories[i] = code.DeclareLocal(typeof(byte*));
            code.Emit(OpCodes.Ldarg_0);
            code.Emit(OpCodes.Ldc_I4, i * nint.Size);
            code.Emit(OpCodes.Add);
            code.Emit(OpCodes.Ldind_I);
            code.Emit(OpCodes.Stloc, memories[i]);
        }

        LocalBuilder place = code.DeclareLocal(typeof(nint));
        code.Emit(OpCodes.Ldc_I4_0);
        code.Emit(OpCodes.Conv_I);
        code.Emit(OpCodes.Stloc, place);
        Label loop = code.DefineLabel();
        code.MarkLabel(loop);

        void Address(int pointer, int displacement)
        {
            code.Emit(OpCodes.Ldloc, memories[pointer]);
            code.Emit(OpCodes.Ldloc, place);
            code.Emit(OpCodes.Add);
            code.Emit(OpCodes.Ldc_I4, displacement);
            code.Emit(OpCodes.Conv_I);
            code.Emit(OpCodes.Add);
        }

        Dictionary<int, LocalBuilder> values = [];
        foreach (int value in network.Schedule())
        {
            NetworkNode node = network.Nodes[value];
            if (node.Operation == NetworkOperation.Input)
            {
                Address(node.A, (node.B * pitch) + (node.C * Unsafe.SizeOf<T>()));
                code.Emit(OpCodes.Unaligned, (byte)1);
                code.Emit(OpCodes.Ldobj, vector);
            }
            else if (node.Operation == NetworkOperation.WithoutNegativeZero)
            {
                code.Emit(OpCodes.Ldloc, values[node.A]);
                if (isFloating)
                {
                    code.Emit(OpCodes.Call, zero);
                    code.Emit(OpCodes.Call, add);
                }
            }
            else
            {
                code.Emit(OpCodes.Ldloc, values[node.A]);
                code.Emit(OpCodes.Ldloc, values[node.B]);
                code.Emit(OpCodes.Call, node.Operation == NetworkOperation.Minimum ? minimum : maximum);
            }

            values[value] = code.DeclareLocal(vector);
            code.Emit(OpCodes.Stloc, values[value]);
        }

        foreach (NetworkOutput output in network.Outputs)
        {
            Address(output.Pointer, output.Row * pitch);
            code.Emit(OpCodes.Ldloc, values[output.Value]);
            code.Emit(OpCodes.Unaligned, (byte)1);
            code.Emit(OpCodes.Stobj, vector);
        }

        code.Emit(OpCodes.Ldloc, place);
        code.Emit(OpCodes.Ldc_I4, (int)width / 8);
        code.Emit(OpCodes.Conv_I);
        code.Emit(OpCodes.Add);
        code.Emit(OpCodes.Stloc, place);
        code.Emit(OpCodes.Ldloc, place);
        code.Emit(OpCodes.Ldarg_1);
        code.Emit(OpCodes.Blt, loop);
        code.Emit(OpCodes.Ret);
        return method.CreateDelegate<CompiledNetwork>();
    }
}
