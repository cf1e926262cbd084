namespace Stacks.Filters.Means;

/// <summary>
/// A mean as a weighted mean of something: with u the value above the pedestal, g a function of u and m what a sample
/// counts, the departure D = sum_q w_q m_q (g_q - g_p) / sum_q w_q m_q gives the change y_p - v_p. D is exactly 0 where
/// all samples are equal, so constants stay constant to the bit. The members here are those of the arithmetic mean.
/// </summary>
internal class Mean
{
    /// <summary>True when the mean is defined for u &gt; 0 alone.</summary>
    public virtual bool NeedsPositive => false;

    /// <summary>g(u).</summary>
    public virtual double Term(double u) => u;

    /// <summary>m(u).</summary>
    public virtual double Mass(double u) => 1;

    /// <summary>y - v at a pixel of value u above the pedestal.</summary>
    public virtual double Change(double u, double departure) => departure;
}
