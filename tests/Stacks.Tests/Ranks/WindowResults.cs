using System.Numerics;
using Stacks.Imaging;
using Xunit;

namespace Stacks.Tests.Ranks;

/// <summary>All quantiles of a plane by one kernel.</summary>
/// <param name="Form">The kernel: how it runs and with which vectors.</param>
/// <param name="Values">For each probability, row after row.</param>
/// <param name="Counts">Samples that took part, row after row.</param>
internal sealed record WindowResults<T>(string Form, T[][] Values, int[] Counts)
    where T : unmanaged, INumber<T>
{
    /// <summary>Every kernel variant there is.</summary>
    public static IEnumerable<(LaneWidth Width, NetworkForm Form)> Variants =>
        from width in Enum.GetValues<LaneWidth>()
        where width <= LaneWidths.Widest
        from form in width == LaneWidth.Single ? [NetworkForm.Interpreted] : new[] { NetworkForm.Interpreted, NetworkForm.Compiled }
        select (width, form);

    /// <summary>The results of every variant.</summary>
    public static IEnumerable<WindowResults<T>> AllForms(WindowQuantiles quantiles, ReflectedRows<T> rows)
    {
        // Windows beyond the networks have one kernel.
        foreach ((LaneWidth width, NetworkForm form) in quantiles.Side > WindowQuantiles.LargestNetwork ? Variants.Take(1) : Variants)
            yield return Of(quantiles, rows, width, form, rows.Height);
    }

    /// <summary>The results of one variant, in bands of so many rows.</summary>
    public static WindowResults<T> Of(WindowQuantiles quantiles, ReflectedRows<T> rows, LaneWidth width, NetworkForm form, int bandHeight)
    {
        T[][] values = [.. Enumerable.Range(0, quantiles.Probabilities.Length).Select(_ => new T[rows.Width * rows.Height])];
        int[] counts = new int[rows.Width * rows.Height];
        bool[] seen = new bool[counts.Length];
        for (int first = 0; first < rows.Height; first += bandHeight)
        {
            QuantileBlocks<T> blocks = quantiles.Over(rows, first, Math.Min(first + bandHeight, rows.Height), new Scratch(), width, form);
            while (blocks.Advance())
            {
                for (int row = 0; row < blocks.Height; row++)
                {
                    for (int i = 0; i < blocks.Width; i++)
                    {
                        int place = ((blocks.Y + row) * rows.Width) + blocks.X + i;
                        Assert.False(seen[place]);
                        seen[place] = true;
                        counts[place] = blocks.Counts(row)[i];
                        for (int p = 0; p < values.Length; p++)
                            values[p][place] = blocks.Values(p, row)[i];
                    }
                }
            }
        }

        Assert.DoesNotContain(false, seen);
        return new WindowResults<T>($"{form}, {width}", values, counts);
    }
}
