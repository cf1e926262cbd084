namespace Stacks.SampleStacks;

/// <summary>
/// night-field.fits: sixteen short exposures of one star field by a fixed camera whose pointing wanders by a few
/// pixels, 16-bit unsigned, with impulses of every kind.
/// </summary>
internal static class NightField
{
    private const int Size = 400;
    private const int Frames = 16;
    private const double Fwhm = 2.4;
    private const int FaintStars = 150;
    private const int SaturatedStars = 6;
    private const int HotPixels = 60;

    private static readonly Detector Camera = new(Gain: 1.46, ReadNoise: 3.2, Pedestal: 200, Rounds: true);

    private sealed record Star(double Flux, double X, double Y);

    /// <summary>Writes the stack and its truth tables.</summary>
    public static void Write(string folder)
    {
        RandomSource random = new(20_250_917);
        List<Star> stars = DrawStars(random);
        List<(int X, int Y, double Rate)> hot = DrawHotPixels(random);

        ImpulseTruth impulses = new();
        TruthTable pointing = new("frame", "dx_px", "dy_px", "sky_electrons");
        List<double[]> frames = [];
        for (int frame = 0; frame < Frames; frame++)
        {
            double dx = frame == 0 ? 0 : random.Between(-3, 3), dy = frame == 0 ? 0 : random.Between(-3, 3);
            // The moon rises.
            double sky = 120 + (3 * frame);
            pointing.Add(TruthTable.Number(frame), TruthTable.Number(dx, 4), TruthTable.Number(dy, 4), TruthTable.Number(sky, 1));

            Light light = new(Size, Size);
            Array.Fill(light.Electrons, sky);
            foreach (Star star in stars)
                light.AddPointSource(star.Flux, star.X + dx, star.Y + dy, Fwhm);

            ImpulseField field = new(light, sky, Camera);
            foreach ((int x, int y, double rate) in hot)
                field.Plant(impulses, frame, "hot", ImpulseShapes.Single(), x, y, random.Poisson(rate) / Camera.Gain);
            for (int i = 0; i < 70; i++)
            {
                Star star = stars[random.Index(stars.Count)];
                field.PlantOnLight(impulses, frame, star.X + dx, star.Y + dy, random);
            }

            for (int i = 0; i < 14; i++)
            {
                field.PlantAnywhere(impulses, frame, "path-track", ImpulseShapes.PathTrack(random), random);
                field.PlantAnywhere(impulses, frame, "track", ImpulseShapes.Track(random), random);
                field.PlantAnywhere(impulses, frame, "block", ImpulseShapes.Block(), random);
            }

            for (int i = 0; i < 60; i++)
                field.PlantAnywhere(impulses, frame, "isolated", ImpulseShapes.Single(), random);
            frames.Add(Camera.Expose(light, field.Charge, random));
        }

        using (FitsFile file = new(Path.Combine(folder, "night-field.fits")))
        {
            file.Write(Header());
            file.WriteUnsigned16(frames);
        }

        SaveStars(stars, Path.Combine(folder, "night-field.stars.tsv"));
        pointing.Save(Path.Combine(folder, "night-field.frames.tsv"));
        impulses.Save(Path.Combine(folder, "night-field.impulses.tsv"));
    }

    private static List<Star> DrawStars(RandomSource random)
    {
        List<Star> stars = [];
        for (int i = 0; i < FaintStars + SaturatedStars; i++)
        {
            double flux = i < FaintStars ? random.LogBetween(300, 300_000) : random.LogBetween(900_000, 2_000_000);
            stars.Add(new Star(flux, random.Between(0, Size - 1), random.Between(0, Size - 1)));
        }

        return stars;
    }

    // Electrons of dark charge in an exposure: 15 to 120 sigmas of the background.
    private static List<(int X, int Y, double Rate)> DrawHotPixels(RandomSource random)
    {
        List<(int X, int Y, double Rate)> hot = [];
        while (hot.Count < HotPixels)
        {
            int x = random.Index(Size), y = random.Index(Size);
            double rate = random.LogBetween(180, 1400);
            if (hot.All(other => Math.Max(Math.Abs(other.X - x), Math.Abs(other.Y - y)) > 2 * ImpulseField.Clearance))
                hot.Add((x, y, rate));
        }

        return hot;
    }

    private static void SaveStars(List<Star> stars, string path)
    {
        TruthTable table = new("star", "flux_electrons", "x_px", "y_px", "fwhm_px");
        for (int i = 0; i < stars.Count; i++)
        {
            table.Add(TruthTable.Number(i), TruthTable.Number(stars[i].Flux, 1), TruthTable.Number(stars[i].X, 4),
                TruthTable.Number(stars[i].Y, 4), TruthTable.Number(Fwhm, 2));
        }

        table.Save(path);
    }

    private static FitsHeader Header() => new FitsHeader()
        .Add("SIMPLE", true, "conforms to FITS standard")
        .Add("BITPIX", 16, "16-bit integers")
        .Add("NAXIS", 3, "a cube of frames")
        .Add("NAXIS1", Size, "columns")
        .Add("NAXIS2", Size, "rows")
        .Add("NAXIS3", Frames, "frames")
        .Add("EXTEND", true, "extensions may follow")
        .Add("BZERO", 32768, "samples are unsigned")
        .Add("BSCALE", 1, "one ADU a step")
        .Add("BUNIT", "adu", "unit of the samples")
        .Add("LONGSTRN", "OGIP 1.0", "long strings are continued")
        .Add("ORIGIN", "Hollow Tarn Observatory", "invented for this sample")
        .Add("TELESCOP", "HTO 0.5 m", "reflector, invented")
        .Add("INSTRUME", "Tarn camera 2", "invented")
        .Add("OBSERVER", "duty observer", "nobody in particular")
        .Add("OBJECT", "Test field 17", "an invented field")
        .Add("FILTER", "R", "red filter")
        .Add("DATE-OBS", "2025-09-17T21:04:30.000", "start of the first frame, UTC")
        .Add("TIMESYS", "UTC", "time scale")
        .Add("EXPTIME", 60.0, "[s] exposure of each frame")
        .Add("EGAIN", Camera.Gain, "[electron/adu] gain")
        .Add("RDNOISE", Camera.ReadNoise, "[electron] read noise, rms")
        .Add("PEDESTAL", Camera.Pedestal, "[adu] level without light")
        .Add("SATURATE", 65535, "[adu] end of the converter")
        .AddHierarch("HTO CAMERA TEMPERATURE", -35.0, "[deg C]")
        .AddHierarch("HTO DOME AZIMUTH", 141.5, "[deg]")
        .Add("WCSAXES", 3, "axes of the coordinate system")
        .Add("CTYPE1", "RA---TAN", "gnomonic projection")
        .Add("CTYPE2", "DEC--TAN", "gnomonic projection")
        .Add("CTYPE3", "TIME", "time from DATE-OBS")
        .Add("CUNIT1", "deg", "")
        .Add("CUNIT2", "deg", "")
        .Add("CUNIT3", "s", "")
        .Add("CRPIX1", 200.5, "centre of the first frame")
        .Add("CRPIX2", 200.5, "centre of the first frame")
        .Add("CRPIX3", 1.0, "first frame")
        .Add("CRVAL1", 291.25, "[deg] right ascension")
        .Add("CRVAL2", 34.5, "[deg] declination")
        .Add("CRVAL3", 0.0, "[s]")
        .Add("CDELT1", -0.00025, "[deg/px]")
        .Add("CDELT2", 0.00025, "[deg/px]")
        .Add("CDELT3", 65.0, "[s] from frame to frame")
        .Add("RADESYS", "ICRS", "reference system")
        .AddLong("OBSNOTE", "Simulated frames: no such observatory, telescope or night exists. Stars are Gaussians of 2.4 px "
            + "full width, integrated over pixels; truth tables stand beside this file.")
        .Say("COMMENT", "The pointing wanders from frame to frame; the coordinates are those of")
        .Say("COMMENT", "the first frame.")
        .Say("HISTORY", "Sixteen frames read out in sequence, not reduced.");
}
