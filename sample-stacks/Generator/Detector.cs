namespace Stacks.SampleStacks;

/// <summary>A detector: photon noise, charge of impulses, read noise, gain, pedestal, and rounding where it has integers.</summary>
/// <param name="Gain">Electrons per ADU.</param>
/// <param name="ReadNoise">Electrons rms.</param>
/// <param name="Pedestal">ADU.</param>
/// <param name="Rounds">True when samples are unsigned 16-bit integers.</param>
internal sealed record Detector(double Gain, double ReadNoise, double Pedestal, bool Rounds)
{
    /// <summary>Samples in ADU.</summary>
    /// <param name="light">Expected electrons.</param>
    /// <param name="charge">Electrons of impulses, added as they are: a deposit has no shot noise of its own here.</param>
    /// <param name="random">Draws, in the order of the pixels.</param>
    public double[] Expose(Light light, double[] charge, RandomSource random)
    {
        double[] samples = new double[charge.Length];
        for (int i = 0; i < samples.Length; i++)
        {
            double electrons = random.Poisson(light.Electrons[i]) + charge[i] + (ReadNoise * random.Normal());
            double sample = (electrons / Gain) + Pedestal;
            samples[i] = Rounds ? Math.Clamp(Math.Round(sample), 0, ushort.MaxValue) : sample;
        }

        return samples;
    }

    /// <summary>Noise sigma in ADU of a pixel that expects this many electrons: the model's, with rounding.</summary>
    public double Sigma(double electrons) =>
        Math.Sqrt((electrons / (Gain * Gain)) + (ReadNoise / Gain * (ReadNoise / Gain)) + (Rounds ? 1.0 / 12 : 0));
}
