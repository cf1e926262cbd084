using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>
/// What headers say about a camera's noise. FITS itself has no keywords for it; these are common practice.
/// </summary>
internal static class CameraKeywords
{
    /// <summary>Electrons per ADU, the surer ones first: GAIN is a camera's setting on many cameras.</summary>
    public static IReadOnlyList<string> GainKeywords { get; } = ["EGAIN", "ATODGAIN", "GAIN"];

    /// <summary>Electrons rms.</summary>
    public static IReadOnlyList<string> ReadNoiseKeywords { get; } = ["RDNOISE", "READNOIS", "READNSE", "RDNOIS", "ENOISE", "RON"];

    /// <summary>The value at which the detector saturates, in value units.</summary>
    public static IReadOnlyList<string> SaturationKeywords { get; } = ["SATURATE", "SATLEVEL", "SATURLEV", "SATUR"];

    /// <summary>Last words of hierarchical keywords that give a figure for each output amplifier.</summary>
    private const string OutputGain = " CONAD";
    private const string OutputReadNoise = " RON";

    /// <summary>True for a figure of 0 or below that stands for "not known" (common practice).</summary>
    public static bool IsUnknown(string keyword, string value) =>
        (GainKeywords.Contains(keyword) || ReadNoiseKeywords.Contains(keyword) || SaturationKeywords.Contains(keyword))
        && double.TryParse(value, NumberStyles.Float, CultureInfo.InvariantCulture, out double number) && number <= 0;

    /// <summary>Gain, read noise and pedestal of a frame; reads its overscan when BIASSEC names one.</summary>
    public static HeaderNoise NoiseOf(FitsReader reader, int frame)
    {
        Hdu hdu = reader.HduOf(frame);
        FitsHeader header = reader.ReadHeader(hdu);
        List<string> origin = [];
        List<string> doubts = [];
        double? gain = GainOf(header, hdu.Layout!.Unit, origin, doubts);
        double? readNoise = Positive(header, ReadNoiseKeywords, origin) ?? OfOutputs(header, OutputReadNoise, origin, doubts);
        double? pedestal = PedestalOf(reader, hdu, header, frame, origin, doubts);
        return new HeaderNoise(gain, readNoise, pedestal, string.Join(", ", origin), doubts.Count == 0 ? null : string.Join("; ", doubts));
    }

    private static double? GainOf(FitsHeader header, string unit, List<string> origin, List<string> doubts)
    {
        string letters = unit.Replace(" ", "", StringComparison.Ordinal).ToUpperInvariant();
        if (letters is "ELECTRON" or "ELECTRONS" or "E-" or "E")
        {
            origin.Add("BUNIT");
            return 1;
        }

        if (letters.EndsWith("/S", StringComparison.Ordinal) || letters.EndsWith("/SEC", StringComparison.Ordinal) || letters.EndsWith("S-1", StringComparison.Ordinal) || letters.EndsWith("S**-1", StringComparison.Ordinal))
        {
            doubts.Add($"values are rates ({unit}): a gain in e-/ADU does not apply to them");
            return null;
        }

        double? gain = Positive(header, GainKeywords, origin);
        if (gain is null)
            return OfOutputs(header, OutputGain, origin, doubts);
        if (origin[^1] == "GAIN")
            doubts.Add("GAIN is a setting on many cameras, not e-/ADU");
        return gain;
    }

    /// <summary>The first keyword with a value above 0.</summary>
    private static double? Positive(FitsHeader header, IReadOnlyList<string> keywords, List<string> origin)
    {
        foreach (string keyword in keywords)
        {
            if (header.FindNumber(keyword) is { } value && value > 0)
            {
                origin.Add(keyword);
                return value;
            }
        }

        return null;
    }

    /// <summary>A figure given for every output amplifier, when all of them agree.</summary>
    private static double? OfOutputs(FitsHeader header, string lastWord, List<string> origin, List<string> doubts)
    {
        double[] values = header.NumbersEndingWith(lastWord).Where(value => value > 0).Distinct().ToArray();
        if (values.Length == 1)
        {
            origin.Add($"HIERARCH ...{lastWord}");
            return values[0];
        }

        if (values.Length > 1)
            doubts.Add($"the outputs of the detector differ in{lastWord}: {string.Join(", ", values.Select(v => v.ToString(CultureInfo.InvariantCulture)))}");
        return null;
    }

    /// <summary>The median of the overscan, else PEDESTAL; null where neither is to be had, for that is not zero.</summary>
    private static double? PedestalOf(FitsReader reader, Hdu hdu, FitsHeader header, int frame, List<string> origin, List<string> doubts)
    {
        if (header.Find("BIASSEC") is { } text)
        {
            if (ImageSection.Parse(text) is not { } section)
                doubts.Add($"BIASSEC '{text}' is no section [x1:x2,y1:y2]");
            else if (!section.IsInside(hdu.Layout!.Width, hdu.Layout.Height))
                doubts.Add($"BIASSEC {text} is not inside the frame of {hdu.Shape}: trimmed or binned since");
            else if (Median(reader, hdu, frame, section) is { } median)
            {
                origin.Add($"overscan of BIASSEC {text}");
                return median;
            }
        }

        if (header.FindNumber("PEDESTAL") is not { } pedestal)
            return null;

        // Some programs write the level, others what must be added to come to zero.
        origin.Add("PEDESTAL");
        if (pedestal < 0)
            doubts.Add(string.Create(CultureInfo.InvariantCulture, $"PEDESTAL = {pedestal} is taken for a correction to add, so the level without light is {-pedestal}"));
        return Math.Abs(pedestal);
    }

    /// <summary>The median value of the valid samples of a section, in value units; null when there are none.</summary>
    private static double? Median(FitsReader reader, Hdu hdu, int frame, ImageSection section)
    {
        FrameLayout layout = hdu.Layout!;
        int size = layout.SampleType.Size();
        byte[] data = new byte[section.Width * size];
        byte[] stored = new byte[data.Length];
        byte[] whole = hdu.Tiles is null ? [] : new byte[layout.StoredBytes];
        if (hdu.Tiles is not null)
            reader.ReadStored(hdu, frame - hdu.FirstFrame, whole);
        List<double> values = [];
        for (long y = section.Top; y < section.Top + section.Height; y++)
        {
            long at = ((y * layout.Width) + section.Left) * size;
            if (hdu.Tiles is null)
            {
                reader.File.Read(data, FitsReader.OffsetOf(hdu, frame - hdu.FirstFrame) + at);
                SampleEncoding.Decode(layout.SampleType, data, stored);
            }

            StoredValues.AddValid(layout, hdu.Tiles is null ? stored : whole.AsSpan((int)at, stored.Length), values);
        }

        if (values.Count == 0)
            return null;
        values.Sort();
        int middle = values.Count / 2;
        return values.Count % 2 == 1 ? values[middle] : (values[middle - 1] + values[middle]) / 2;
    }
}
