using MathNet.Numerics.Distributions;
using Stacks.Abstractions;
using Stacks.Imaging;
using Stacks.Noise;
using Xunit;

namespace Stacks.Tests.Noise;

public class DifferenceNoiseTests
{
    private const int Side = 256;

    private static double[] Normals(double mean, double sigma, int seed, int length = Side * Side)
    {
        Random random = new(seed);
        double[] samples = new double[length];
        for (int i = 0; i < length; i++)
            samples[i] = Normal.Sample(random, mean, sigma);
        return samples;
    }

    private static NoiseMeasurement Measure<T>(T[] samples, double step, NoiseModel? model = null, SampleFlags[]? flags = null, Lattice? lattice = null, int width = Side)
        where T : unmanaged, System.Numerics.INumber<T> =>
        DifferenceNoise.Measure(
            new Plane<T>(samples, width, samples.Length / width),
            new Plane<SampleFlags>(flags ?? new SampleFlags[samples.Length], width, samples.Length / width),
            lattice ?? Lattice.Single,
            step,
            model,
            new Scratch());

    /// <summary>Sigma of round(X), X normal: sqrt(sum k^2 p(k) - mean^2), p(k) = CDF(k + 1/2) - CDF(k - 1/2), from Math.NET's CDF.</summary>
    private static double RoundedSigma(double mean, double sigma)
    {
        double first = 0, second = 0;
        for (int k = (int)(mean - (12 * sigma)) - 2; k <= mean + (12 * sigma) + 2; k++)
        {
            double p = Normal.CDF(mean, sigma, k + 0.5) - Normal.CDF(mean, sigma, k - 0.5);
            first += k * p;
            second += (double)k * k * p;
        }

        return Math.Sqrt(second - (first * first));
    }

    [Theory]
    [InlineData(0.3)]
    [InlineData(0.4)]
    [InlineData(0.5)]
    [InlineData(0.6)]
    [InlineData(0.8)]
    [InlineData(1.2)]
    [InlineData(2.5)]
    [InlineData(8)]
    [InlineData(40)]
    [InlineData(200)]
    public void Sigma_of_rounded_normals_is_that_of_their_distribution(double sigma)
    {
        // Six seeds of 64516 responses: the standard error of the mean is about 0.35 %.
        foreach (double mean in new[] { 1000.0, 1000.27, 1000.5 })
        {
            double measured = Enumerable.Range(1, 6).Average(seed =>
                Measure([.. Normals(mean, sigma, seed).Select(v => (ushort)Math.Round(v))], 1).Sigma);
            Assert.InRange(measured / RoundedSigma(mean, sigma), 0.985, 1.015);
        }
    }

    [Theory]
    [InlineData(0.3)]
    [InlineData(5)]
    [InlineData(200)]
    public void Sigma_of_continuous_normals_is_theirs(double sigma)
    {
        double single = Enumerable.Range(1, 6).Average(seed => Measure([.. Normals(0, sigma, seed).Select(v => (float)v)], 0).Sigma);
        double wide = Enumerable.Range(1, 6).Average(seed => Measure(Normals(1e6, sigma, seed), 0).Sigma);
        Assert.InRange(single / sigma, 0.99, 1.01);
        Assert.InRange(wide / sigma, 0.99, 1.01);
    }

    [Fact]
    public void Scaled_samples_scale_the_result()
    {
        short[] stored = [.. Normals(0, 0.7, 3).Select(v => (short)Math.Round(v))];
        double plain = Measure(stored, 1).Sigma;
        double scaled = Measure([.. stored.Select(v => 32.1 + (v * -0.0123))], 0.0123).Sigma;
        Assert.Equal(plain * 0.0123, scaled, 1e-12);
    }

    [Fact]
    public void Slopes_in_x_and_y_add_nothing()
    {
        double[] noise = Normals(0, 3, 5);
        double[] sloped = [.. noise.Select((v, i) => v + (7.0 * (i % Side)) + (0.05 * (i / Side) * (i / Side)))];
        Assert.Equal(Measure(noise, 0).Sigma, Measure(sloped, 0).Sigma, 1e-9);
    }

    [Fact]
    public void Impulses_hardly_count()
    {
        // 0.5 % of the pixels: some 4.5 % of the responses hold one.
        double[] samples = Normals(100, 3, 6);
        Random random = new(1);
        for (int i = 0; i < samples.Length / 200; i++)
            samples[random.Next(samples.Length)] += 500;
        Assert.InRange(Measure(samples, 0).Sigma, 2.95, 3.3);
        ushort[] quiet = [.. Normals(100, 0.3, 6).Select(v => (ushort)Math.Round(v))];
        for (int i = 0; i < quiet.Length / 200; i++)
            quiet[random.Next(quiet.Length)] += 500;
        Assert.InRange(Measure(quiet, 1).Sigma / RoundedSigma(100, 0.3), 0.95, 1.15);
    }

    [Fact]
    public void Missing_and_saturated_samples_take_no_part()
    {
        double[] samples = Normals(100, 3, 7);
        SampleFlags[] flags = new SampleFlags[samples.Length];
        for (int i = 0; i < samples.Length; i++)
        {
            if (i % Side < Side / 2)
            {
                bool missing = i < samples.Length / 2;
                flags[i] = missing ? SampleFlags.Missing : SampleFlags.Saturated;
                samples[i] = missing && i % 3 == 0 ? double.NaN : 1e9 * (i % 5);
            }
        }

        Assert.InRange(Measure(samples, 0, flags: flags).Sigma, 2.9, 3.1);
    }

    [Fact]
    public void A_mosaic_is_measured_within_its_sublattices()
    {
        double[] samples = Normals(0, 3, 8);
        for (int i = 0; i < samples.Length; i++)
            samples[i] += 1000 * ((i % Side % 2) + (2 * (i / Side % 2)));
        Assert.InRange(Measure(samples, 0, lattice: new Lattice(2, 2)).Sigma, 2.95, 3.05);
        // The same levels, told to be one frame, are a pattern of period 2: the mask answers -16/6 of its product term only,
        // so a checkerboard is used to show what would go wrong.
        for (int i = 0; i < samples.Length; i++)
            samples[i] += (i % Side % 2) == (i / Side % 2) ? 1000 : 0;
        Assert.True(Measure(samples, 0).Sigma > 100);
        Assert.InRange(Measure(samples, 0, lattice: new Lattice(2, 2)).Sigma, 2.95, 3.05);
    }

    [Fact]
    public void Large_frames_are_measured_on_some_rows_of_every_sublattice()
    {
        const int Width = 2000;
        double[] samples = Normals(0, 3, 9, Width * 1200);
        Assert.InRange(Measure(samples, 0, width: Width).Sigma, 2.95, 3.05);

        // Odd rows twice as noisy: pooled over both, sigma lies between.
        for (int i = 0; i < samples.Length; i++)
            samples[i] *= i / Width % 2 == 1 ? 2 : 1;
        Assert.InRange(Measure(samples, 0, lattice: new Lattice(2, 2), width: Width).Sigma, 3.3, 5.5);
    }

    [Fact]
    public void Too_few_samples_measure_nothing()
    {
        Assert.True(double.IsNaN(Measure(Normals(0, 1, 1, 100), 0, width: 10).Sigma));
        Assert.True(double.IsNaN(Measure(Normals(0, 1, 1, 10), 0, width: 10).Sigma));
        Assert.False(double.IsNaN(Measure(Normals(0, 1, 1, 144), 0, width: 12).Sigma));
    }

    [Fact]
    public void A_flat_frame_has_no_noise()
    {
        Assert.Equal(0, Measure(new ushort[Side * Side], 1).Sigma);
        Assert.Equal(0, Measure([.. Enumerable.Repeat(17.5f, Side * Side)], 0).Sigma);
    }

    [Fact]
    public void The_ratio_to_the_right_model_is_one_also_where_the_level_varies()
    {
        // Poisson light of 20 to 10000 electrons across the frame: gain 1.46 e-/ADU, read noise 3.2 e-, pedestal 200 ADU.
        Random random = new(11);
        LinearNoise model = LinearNoise.FromCamera(1.46, 3.2, 200, 1);
        ushort[] samples = new ushort[Side * Side];
        for (int i = 0; i < samples.Length; i++)
        {
            double electrons = 20 + (9980.0 * (i % Side) / Side);
            samples[i] = (ushort)Math.Round(200 + (Normal.Sample(random, electrons, Math.Sqrt(electrons + (3.2 * 3.2))) / 1.46));
        }

        Assert.InRange(Measure(samples, 1, model).Ratio, 0.98, 1.02);

        // The pedestal taken for signal: where light is faint the model expects far too much noise.
        for (int i = 0; i < samples.Length; i++)
            samples[i] = (ushort)Math.Round(200 + (Normal.Sample(random, 20, Math.Sqrt(20 + (3.2 * 3.2))) / 1.46));
        Assert.InRange(Measure(samples, 1, model).Ratio, 0.97, 1.03);
        double omitted = Measure(samples, 1, LinearNoise.FromCamera(1.46, 3.2, 0, 1)).Ratio;
        Assert.True(ModelCheck.Disagrees(omitted));
        Assert.Contains("pedestal", ModelCheck.Explain(omitted), StringComparison.Ordinal);
        Assert.False(ModelCheck.Disagrees(double.NaN));
        Assert.False(ModelCheck.Disagrees(1.49));
        Assert.True(ModelCheck.Disagrees(1.51));
        Assert.True(ModelCheck.Disagrees(0.66));
    }

    [Fact]
    public void The_ratio_holds_where_noise_is_below_half_a_step()
    {
        ushort[] samples = [.. Normals(500, 0.35, 4).Select(v => (ushort)Math.Round(v))];
        Assert.InRange(Measure(samples, 1, LinearNoise.Constant(RoundedSigma(500, 0.35))).Ratio, 0.98, 1.02);
    }
}
