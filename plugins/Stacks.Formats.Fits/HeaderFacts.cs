using System.Globalization;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>Facts from the headers, for people: what was observed, when, how long, through what, with what.</summary>
internal static class HeaderFacts
{
    /// <summary>
    /// A fact and the keywords that may hold it, the better first: DATE-OBS, OBJECT, TELESCOP, INSTRUME and OBSERVER by
    /// Standard 4.0 (section 4.4.2), the others by common practice.
    /// </summary>
    private static readonly (string Label, IReadOnlyList<string> Keywords, string Unit)[] Wanted =
    [
        ("object", ["OBJECT", "TARGNAME"], ""),
        ("observed", ["DATE-OBS", "DATE-BEG", "MJD-OBS"], ""),
        ("exposure", ["EXPTIME", "EXPOSURE", "XPOSURE"], "s"),
        ("filter", ["FILTER", "FILTNAM1", "FILTER1"], ""),
        ("second filter", ["FILTER2"], ""),
        ("telescope", ["TELESCOP"], ""),
        ("instrument", ["INSTRUME"], ""),
        ("detector", ["DETECTOR"], ""),
        ("observer", ["OBSERVER"], ""),
        ("frame type", ["IMAGETYP", "OBSTYPE"], ""),
        ("binning", ["CCDSUM", "BINNING", "XBINNING"], ""),
        ("detector temperature", ["CCD-TEMP", "DET-TEMP"], "C"),
        ("gain", CameraKeywords.GainKeywords, "e-/ADU"),
        ("read noise", CameraKeywords.ReadNoiseKeywords, "e-"),
        ("pedestal", ["PEDESTAL"], "ADU"),
        ("overscan", ["BIASSEC"], ""),
        ("saturation", CameraKeywords.SaturationKeywords, ""),
        ("time of day", ["TIME-OBS", "UT"], ""),
        ("airmass", ["AIRMASS"], ""),
    ];

    /// <summary>The facts of a file, from the header of its first science HDU or the primary one.</summary>
    public static IReadOnlyList<HeaderFact> Of(FitsReader reader)
    {
        Hdu first = reader.HduOf(0);
        FitsHeader header = reader.ReadHeader(first);
        List<HeaderFact> facts = [];
        foreach ((string label, IReadOnlyList<string> keywords, string unit) in Wanted)
        {
            foreach (string keyword in keywords)
            {
                if ((header.Find(keyword) ?? reader.Primary.Find(keyword))?.Trim() is { Length: > 0 } text && !CameraKeywords.IsUnknown(keyword, text))
                {
                    facts.Add(new HeaderFact(label, $"{text} {unit}".TrimEnd() + $" ({keyword})"));
                    break;
                }
            }
        }

        facts.Add(new HeaderFact("unit", first.Layout!.Unit));
        if (!first.Layout.Transform.IsIdentity)
            facts.Add(new HeaderFact("scaling", string.Create(CultureInfo.InvariantCulture, $"value = {first.Layout.Transform.Zero} + {first.Layout.Transform.Scale} x stored")));
        if (first.Layout.Blank is { } blank)
            facts.Add(new HeaderFact("missing samples", string.Create(CultureInfo.InvariantCulture, $"stored as {blank} (BLANK)")));
        if (MosaicPattern.Text(header) is { } pattern)
        {
            facts.Add(new HeaderFact("colour-filter mosaic", first.Layout.Lattice.IsSingle
                ? $"{pattern}; its rows are not known: state [input] mosaic in the recipe"
                : string.Create(CultureInfo.InvariantCulture, $"{pattern}, repeats every {first.Layout.Lattice.PeriodX} x {first.Layout.Lattice.PeriodY} px")));
        }

        return facts;
    }
}
