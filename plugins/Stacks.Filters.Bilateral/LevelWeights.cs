using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;

namespace Stacks.Filters.Bilateral;

/// <summary>
/// Weights of a sample on range levels D apart: exp(-(T - l)^2 / s^2) on the J levels about T. The product of two
/// samples' weights, summed over levels, is exp(-(T_p - T_q)^2 / 2 s^2) sqrt(pi / 2) s / D within a relative ripple of
/// 2 exp(-pi^2 s^2 / 2 D^2), because the product of two Gaussians on one axis is a Gaussian about their middle (Poisson
/// summation).
/// </summary>
/// <remarks>
/// A guide sample is a whole number: its first level, times 2^15, and its place between levels. The table holds 256
/// places and is linear between them; each row has zeros on either side, so that sixteen levels about the J can be read
/// at once.
/// </remarks>
internal sealed class LevelWeights
{
    /// <summary>Levels of a vector.</summary>
    public const int Lanes = 16;

    /// <summary>Bits of a guide sample below its level.</summary>
    public const int FractionBits = 15;

    private const int PlaceBits = 8;
    private const int BetweenBits = FractionBits - PlaceBits;

    private readonly float[] table;
    private readonly int stride;

    /// <summary>Weights on levels <paramref name="spacing"/> range sigmas apart.</summary>
    /// <param name="spacing">D / s.</param>
    /// <param name="count">J, even, at most 16.</param>
    public LevelWeights(double spacing, int count)
    {
        Spacing = spacing;
        Count = count;
        Room = Lanes - count;
        stride = Lanes + Room;
        table = new float[((1 << PlaceBits) + 1) * stride];
        for (int place = 0; place <= 1 << PlaceBits; place++)
        {
            for (int j = 0; j < count; j++)
            {
                double apart = spacing * (((double)place / (1 << PlaceBits)) + (count / 2) - 1 - j);
                table[(place * stride) + Room + j] = (float)Math.Exp(-apart * apart);
            }
        }
    }

    /// <summary>
    /// The levels for a tolerance in range sigmas: D = 0.7 s to 4.2 s on either side, a ripple of 8.5e-5 with weights true to
    /// 1e-4 of themselves out to 4.5 s; or D = 0.6 s, a ripple of 2e-6, below 5e-4.
    /// </summary>
    public static LevelWeights Of(double tolerance) => tolerance >= 5e-4 ? new(0.7, 12) : new(0.6, 14);

    /// <summary>D / s.</summary>
    public double Spacing { get; }

    /// <summary>J.</summary>
    public int Count { get; }

    /// <summary>16 - J: how far a sample's first level may lie above the first of sixteen levels that hold all of its J.</summary>
    public int Room { get; }

    /// <summary>D / (sqrt(pi / 2) s): what makes the sum over levels 1 for equal samples.</summary>
    public double Norm => Spacing / Math.Sqrt(Math.PI / 2);

    /// <summary>The table, for reading.</summary>
    public LevelTable Table => new(ref MemoryMarshal.GetArrayDataReference(table), stride, Room);

    /// <summary>The weights of a guide sample on the sixteen levels from its own first on.</summary>
    public TLanes Of<TLanes>(int guide)
        where TLanes : struct, ILevelLanes<TLanes> => Table.Of<TLanes>(guide, 0);

    /// <summary>What a kernel holds of the table in its loop.</summary>
    public readonly ref struct LevelTable(ref float start, int stride, int room)
    {
        private readonly ref float start = ref start;
        private readonly nint stride = stride, room = room;

        /// <summary>The weights of a guide sample on sixteen levels, the first of which lies <paramref name="shift"/> levels below its own first.</summary>
        [MethodImpl(MethodImplOptions.AggressiveInlining)]
        public TLanes Of<TLanes>(int guide, int shift)
            where TLanes : struct, ILevelLanes<TLanes>
        {
            nint at = (((guide >> BetweenBits) & ((1 << PlaceBits) - 1)) * stride) + room - shift;
            TLanes low = TLanes.Load(ref start, at), high = TLanes.Load(ref start, at + stride);
            TLanes between = TLanes.All((guide & ((1 << BetweenBits) - 1)) * (1f / (1 << BetweenBits)));
            return TLanes.MultiplyAdd(high - low, between, low);
        }
    }
}
