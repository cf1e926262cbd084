using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using System.Runtime.Intrinsics.X86;

namespace Stacks.Imaging;

/// <summary>
/// Sums of a few neighbours along a row, y_x = v_x + v_(x+1) + ..., put together from pairs. Each number of terms is a
/// kernel of its own, written once over where the neighbours come from (<see cref="ISource{TLanes}"/>).
/// </summary>
internal static class Neighbours
{
    /// <summary>Neighbours of the samples in hand.</summary>
    public interface ISource<TLanes>
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        /// <summary>v_(x+n).</summary>
        TLanes One(int n);

        /// <summary>v_(x+n) + v_(x+n+1).</summary>
        TLanes Two(int n);
    }

    /// <summary>A sum of so many neighbours.</summary>
    public interface ITerms
    {
        /// <summary>The sums from x on.</summary>
        static abstract TLanes Sum<TLanes, TSource>(TSource v)
            where TLanes : struct, IDoubleLanes<TLanes>
            where TSource : struct, ISource<TLanes>, allows ref struct;
    }

    /// <summary>Computes sums from 0 to <paramref name="length"/>, a multiple of 8; reads 16 samples further.</summary>
    public static void Sum<TLanes, TTerms>(ref double row, ref double sums, nint length)
        where TLanes : struct, IDoubleLanes<TLanes>
        where TTerms : struct, ITerms
    {
        if (typeof(TLanes) == typeof(DoubleLanes512) && Avx512F.IsSupported)
        {
            SumInRegisters<TTerms>(ref row, ref sums, length);
            return;
        }

        for (nint x = 0; x < length; x += TLanes.Count)
            TTerms.Sum<TLanes, InMemory<TLanes>>(new InMemory<TLanes>(ref row, x)).Store(ref sums, x);
    }

    /// <summary>A vector that lies across two lines of memory costs several that do not: here each is loaded once, and neighbours are shifted out of two.</summary>
    private static void SumInRegisters<TTerms>(ref double row, ref double sums, nint length)
        where TTerms : struct, ITerms
    {
        Vector512<double> here = Vector512.LoadUnsafe(ref row), next = Vector512.LoadUnsafe(ref row, 8);
        Vector512<double> pairs = here + Shift(here, next, 1);
        for (nint x = 0; x < length; x += 8)
        {
            Vector512<double> afterNext = Vector512.LoadUnsafe(ref row, (nuint)x + 16);
            Vector512<double> nextPairs = next + Shift(next, afterNext, 1);
            TTerms.Sum<DoubleLanes512, InRegisters>(new InRegisters(here, next, pairs, nextPairs)).Store(ref sums, x);
            here = next;
            next = afterNext;
            pairs = nextPairs;
        }
    }

    /// <summary>Three.</summary>
    public readonly struct Three : ITerms
    {
        /// <inheritdoc/>
        public static TLanes Sum<TLanes, TSource>(TSource v)
            where TLanes : struct, IDoubleLanes<TLanes>
            where TSource : struct, ISource<TLanes>, allows ref struct => v.Two(0) + v.One(2);
    }

    /// <summary>Five.</summary>
    public readonly struct Five : ITerms
    {
        /// <inheritdoc/>
        public static TLanes Sum<TLanes, TSource>(TSource v)
            where TLanes : struct, IDoubleLanes<TLanes>
            where TSource : struct, ISource<TLanes>, allows ref struct => v.Two(0) + v.Two(2) + v.One(4);
    }

    /// <summary>Seven.</summary>
    public readonly struct Seven : ITerms
    {
        /// <inheritdoc/>
        public static TLanes Sum<TLanes, TSource>(TSource v)
            where TLanes : struct, IDoubleLanes<TLanes>
            where TSource : struct, ISource<TLanes>, allows ref struct => v.Two(0) + v.Two(2) + (v.Two(4) + v.One(6));
    }

    /// <summary>Eight.</summary>
    public readonly struct Eight : ITerms
    {
        /// <inheritdoc/>
        public static TLanes Sum<TLanes, TSource>(TSource v)
            where TLanes : struct, IDoubleLanes<TLanes>
            where TSource : struct, ISource<TLanes>, allows ref struct => v.Two(0) + v.Two(2) + (v.Two(4) + v.Two(6));
    }

    private readonly ref struct InMemory<TLanes>(ref double row, nint x) : ISource<TLanes>
        where TLanes : struct, IDoubleLanes<TLanes>
    {
        private readonly ref double start = ref Unsafe.Add(ref row, x);

        public TLanes One(int n) => TLanes.Load(ref start, n);

        public TLanes Two(int n) => TLanes.Load(ref start, n) + TLanes.Load(ref start, n + 1);
    }

    private readonly struct InRegisters(Vector512<double> here, Vector512<double> next, Vector512<double> pairs, Vector512<double> nextPairs) : ISource<DoubleLanes512>
    {
        private readonly Vector512<double> here = here, next = next, pairs = pairs, nextPairs = nextPairs;

        [MethodImpl(MethodImplOptions.AggressiveInlining)]
        public DoubleLanes512 One(int n) => new(Shift(here, next, n));

        [MethodImpl(MethodImplOptions.AggressiveInlining)]
        public DoubleLanes512 Two(int n) => new(Shift(pairs, nextPairs, n));
    }

    /// <summary>Lanes n to n + 7 of two vectors; n is 0, 1, 2, 4 or 6.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private static Vector512<double> Shift(Vector512<double> low, Vector512<double> high, int n) => n switch
    {
        0 => low,
        1 => Avx512F.AlignRight64(high.AsInt64(), low.AsInt64(), 1).AsDouble(),
        2 => Avx512F.AlignRight64(high.AsInt64(), low.AsInt64(), 2).AsDouble(),
        4 => Avx512F.AlignRight64(high.AsInt64(), low.AsInt64(), 4).AsDouble(),
        _ => Avx512F.AlignRight64(high.AsInt64(), low.AsInt64(), 6).AsDouble(),
    };
}
