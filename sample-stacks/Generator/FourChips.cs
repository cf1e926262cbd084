namespace Stacks.SampleStacks;

/// <summary>
/// four-chips.fits: one exposure of a mosaic of four detectors, an extension each, 32-bit floats, each with its own
/// gain, read noise and pedestal; dead pixels are NaN.
/// </summary>
internal static class FourChips
{
    private const int Size = 240;
    private const int Stars = 45;
    private const double Fwhm = 3.0;
    private const double Sky = 260;

    private static readonly Detector[] Chips =
    [
        new(Gain: 1.92, ReadNoise: 4.1, Pedestal: 310, Rounds: false),
        new(Gain: 2.07, ReadNoise: 3.8, Pedestal: 295, Rounds: false),
        new(Gain: 2.23, ReadNoise: 5.0, Pedestal: 322, Rounds: false),
        new(Gain: 1.78, ReadNoise: 4.4, Pedestal: 301, Rounds: false),
    ];

    /// <summary>Writes the stack and its truth tables.</summary>
    public static void Write(string folder)
    {
        RandomSource random = new(20_250_611);
        ImpulseTruth impulses = new();
        TruthTable stars = new("frame", "flux_electrons", "x_px", "y_px", "fwhm_px");
        using FitsFile file = new(Path.Combine(folder, "four-chips.fits"));
        file.Write(PrimaryHeader());
        for (int chip = 0; chip < Chips.Length; chip++)
        {
            file.Write(ExtensionHeader(chip));
            file.WriteFloat32(Expose(chip, stars, impulses, random));
        }

        stars.Save(Path.Combine(folder, "four-chips.stars.tsv"));
        impulses.Save(Path.Combine(folder, "four-chips.impulses.tsv"));
    }

    private static double[] Expose(int chip, TruthTable stars, ImpulseTruth impulses, RandomSource random)
    {
        Light light = new(Size, Size);
        Array.Fill(light.Electrons, Sky);
        List<(double X, double Y)> places = [];
        for (int i = 0; i < Stars; i++)
        {
            double flux = random.LogBetween(1000, 400_000), x = random.Between(0, Size - 1), y = random.Between(0, Size - 1);
            light.AddPointSource(flux, x, y, Fwhm);
            places.Add((x, y));
            stars.Add(TruthTable.Number(chip), TruthTable.Number(flux, 1), TruthTable.Number(x, 4), TruthTable.Number(y, 4), TruthTable.Number(Fwhm, 2));
        }

        ImpulseField field = new(light, Sky, Chips[chip]);
        for (int i = 0; i < 40; i++)
        {
            (double x, double y) = places[random.Index(places.Count)];
            field.PlantOnLight(impulses, chip, x, y, random);
        }

        for (int i = 0; i < 20; i++)
        {
            field.PlantAnywhere(impulses, chip, "track", ImpulseShapes.Track(random), random);
            field.PlantAnywhere(impulses, chip, "block", ImpulseShapes.Block(), random);
        }

        for (int i = 0; i < 100; i++)
            field.PlantAnywhere(impulses, chip, "isolated", ImpulseShapes.Single(), random);

        double[] samples = Chips[chip].Expose(light, field.Charge, random);
        Kill(samples, field.Charge, random);
        return samples;
    }

    // Dead pixels: a column over part of the chip, a small patch, and some single ones; never where an impulse is.
    private static void Kill(double[] samples, double[] charge, RandomSource random)
    {
        int column = random.Index(Size), from = random.Index(Size / 2), patchX = random.Index(Size - 6), patchY = random.Index(Size - 4);
        List<(int X, int Y)> dead =
        [
            .. Enumerable.Range(from, Size / 2).Select(y => (column, y)),
            .. Enumerable.Range(0, 24).Select(i => (patchX + (i % 6), patchY + (i / 6))),
            .. Enumerable.Range(0, 20).Select(_ => (random.Index(Size), random.Index(Size))),
        ];
        foreach ((int x, int y) in dead)
        {
            if (charge[(y * Size) + x] == 0)
                samples[(y * Size) + x] = double.NaN;
        }
    }

    private static FitsHeader PrimaryHeader() => new FitsHeader()
        .Add("SIMPLE", true, "conforms to FITS standard")
        .Add("BITPIX", 8, "no data here")
        .Add("NAXIS", 0, "data are in the extensions")
        .Add("EXTEND", true, "extensions follow")
        .Add("NEXTEND", Chips.Length, "image extensions")
        .Add("ORIGIN", "Hollow Tarn Observatory", "invented for this sample")
        .Add("TELESCOP", "HTO 1.2 m", "reflector, invented")
        .Add("INSTRUME", "Four-chip mosaic", "invented")
        .Add("OBJECT", "Test field 4", "an invented field")
        .Add("FILTER", "i", "near infrared filter")
        .Add("DATE-OBS", "2025-06-11T23:41:08.500", "start of the exposure, UTC")
        .Add("TIMESYS", "UTC", "time scale")
        .Add("EXPTIME", 180.0, "[s] exposure")
        .Say("COMMENT", "Simulated frames: no such observatory exists. Truth tables stand beside")
        .Say("COMMENT", "this file.")
        .Say("HISTORY", "Divided by the flat field, which makes real numbers of the samples.");

    private static FitsHeader ExtensionHeader(int chip) => new FitsHeader()
        .Add("XTENSION", "IMAGE", "image extension")
        .Add("BITPIX", -32, "32-bit floating point")
        .Add("NAXIS", 2, "one frame")
        .Add("NAXIS1", Size, "columns")
        .Add("NAXIS2", Size, "rows")
        .Add("PCOUNT", 0, "no parameters")
        .Add("GCOUNT", 1, "one group")
        .Add("EXTNAME", "SCI", "science frame")
        .Add("EXTVER", chip + 1, "chip number")
        .Add("BUNIT", "adu", "unit of the samples")
        .Add("EGAIN", Chips[chip].Gain, "[electron/adu] gain")
        .Add("RDNOISE", Chips[chip].ReadNoise, "[electron] read noise, rms")
        .Add("PEDESTAL", Chips[chip].Pedestal, "[adu] level without light")
        .Add("DETSEC", $"[{(chip % 2 * Size) + 1}:{(chip % 2 * Size) + Size},{(chip / 2 * Size) + 1}:{(chip / 2 * Size) + Size}]", "place in the mosaic");
}
