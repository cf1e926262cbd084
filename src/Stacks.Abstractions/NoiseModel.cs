namespace Stacks.Abstractions;

/// <summary>
/// The noise of one frame: variance as a function of place and level, and the transform T that makes it 1.
/// The members by row let a model hold per-pixel maps; a constant model ignores the place.
/// </summary>
public abstract class NoiseModel
{
    /// <summary>Variance at a level, in value units squared.</summary>
    /// <param name="x">Column in the frame.</param>
    /// <param name="y">Row in the frame.</param>
    /// <param name="level">Expected value there, in value units.</param>
    public abstract double Variance(int x, int y, double level);

    /// <summary>Square root of <see cref="Variance"/>.</summary>
    public double Sigma(int x, int y, double level) => Math.Sqrt(Variance(x, y, level));

    /// <summary>T(value): differences of T are in noise sigmas. Used only to compare samples.</summary>
    public abstract double Stabilise(int x, int y, double value);

    /// <summary>The least variance the model gives anywhere: a bound for quick tests, in value units squared.</summary>
    public abstract double LeastVariance { get; }

    /// <summary><see cref="Variance"/> for samples of a row, rounded to float.</summary>
    /// <param name="x">Column in the frame of the first.</param>
    /// <param name="y">Row in the frame.</param>
    /// <param name="levels">Levels, one for each column from <paramref name="x"/>.</param>
    /// <param name="variances">Receives as many variances.</param>
    public virtual void VarianceByRow(int x, int y, ReadOnlySpan<float> levels, Span<float> variances)
    {
        for (int i = 0; i < levels.Length; i++)
            variances[i] = (float)Variance(x + i, y, levels[i]);
    }

    /// <summary><see cref="Variance"/> for neighbouring samples of a row; the same bits.</summary>
    /// <param name="x">Column of the first in the frame.</param>
    /// <param name="y">Row in the frame.</param>
    /// <param name="levels">Levels, one for each column from <paramref name="x"/> on.</param>
    /// <param name="variances">Receives as many variances.</param>
    public virtual void VarianceByRow(int x, int y, ReadOnlySpan<double> levels, Span<double> variances)
    {
        for (int i = 0; i < levels.Length; i++)
            variances[i] = Variance(x + i, y, levels[i]);
    }

    /// <summary><see cref="Stabilise"/> for every sample of a row.</summary>
    /// <param name="y">Row in the frame.</param>
    /// <param name="values">Values, one for each column from 0.</param>
    /// <param name="stabilised">Receives as many values of T.</param>
    public virtual void StabiliseByRow(int y, ReadOnlySpan<double> values, Span<double> stabilised)
    {
        for (int x = 0; x < values.Length; x++)
            stabilised[x] = Stabilise(x, y, values[x]);
    }

    /// <summary>The model of one sub-lattice of a mosaic: its sample (x, y) is (offsetX + x * periodX, ...) of this frame.</summary>
    public virtual NoiseModel Sublattice(Lattice lattice, int offsetX, int offsetY) => this;

    /// <summary>One line for plans and provenance, with units.</summary>
    public abstract string Describe();
}
