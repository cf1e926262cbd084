using System.Globalization;
using System.Text;

namespace Stacks.SampleStacks;

/// <summary>
/// wandering-cells.ome.tif: a time-lapse of crawling cells in two fluorescence channels of different gain, 16-bit
/// unsigned, with bright impulses. The second channel holds vesicles, spots as sharp as the optics allow.
/// </summary>
internal static class WanderingCells
{
    private const int Size = 256;
    private const int Times = 14;
    private const int Cells = 9;
    private const int VesiclesPerCell = 4;
    private const double Fwhm = 2.6;
    private const double PixelMicrometres = 0.325;
    private const double SecondsPerFrame = 120;

    private static readonly string[] ChannelNames = ["nuclei", "cytoplasm"];
    private static readonly double[] Background = [30, 55];

    // The second channel is read through an amplifier with higher gain: fewer electrons an ADU.
    private static readonly Detector[] Detectors =
    [
        new(Gain: 2.1, ReadNoise: 1.6, Pedestal: 100, Rounds: true),
        new(Gain: 0.55, ReadNoise: 2.4, Pedestal: 140, Rounds: true),
    ];

    private sealed record Vesicle(double Flux, double OffsetX, double OffsetY);

    private sealed class Cell
    {
        public required double X { get; set; }
        public required double Y { get; set; }
        public required (double X, double Y) Heading { get; set; }
        public required double Speed { get; init; }
        public required double Long { get; init; }
        public required double Short { get; init; }
        public required double[] Peaks { get; init; }
        public required List<Vesicle> Vesicles { get; init; }
    }

    /// <summary>Writes the stack and its truth tables.</summary>
    public static void Write(string folder)
    {
        RandomSource random = new(20_250_402);
        List<Cell> cells = [.. Enumerable.Range(0, Cells).Select(_ => DrawCell(random))];
        ImpulseTruth impulses = new();
        TruthTable cellTable = new(
            "time", "cell", "x_px", "y_px", "nucleus_sigma_long_px", "nucleus_sigma_short_px", "nuclei_peak_electrons", "cytoplasm_peak_electrons");
        TruthTable spotTable = new("frame", "flux_electrons", "x_px", "y_px", "fwhm_px");
        List<double[]> planes = [];
        for (int time = 0; time < Times; time++)
        {
            AddCells(cellTable, time, cells);
            for (int channel = 0; channel < 2; channel++)
            {
                int frame = (time * 2) + channel;
                Light light = Scene(cells, channel);
                if (channel == 1)
                    AddVesicles(spotTable, frame, cells, light, random);
                planes.Add(Expose(impulses, frame, light, channel, cells, random));
            }

            foreach (Cell cell in cells)
                Move(cell, random);
        }

        OmeTiffFile.Write(
            Path.Combine(folder, "wandering-cells.ome.tif"), Xml(), planes, Size, Size, (uint)Math.Round(10_000 / PixelMicrometres));
        cellTable.Save(Path.Combine(folder, "wandering-cells.cells.tsv"));
        spotTable.Save(Path.Combine(folder, "wandering-cells.vesicles.tsv"));
        impulses.Save(Path.Combine(folder, "wandering-cells.impulses.tsv"));
    }

    private static Cell DrawCell(RandomSource random) => new()
    {
        X = random.Between(25, Size - 25),
        Y = random.Between(25, Size - 25),
        Heading = random.Direction(),
        Speed = random.Between(0.5, 3.5),
        Long = random.Between(8.5, 11),
        Short = random.Between(7, 8.5),
        Peaks = [random.Between(150, 450), random.Between(80, 300)],
        Vesicles = [.. Enumerable.Range(0, VesiclesPerCell).Select(_ =>
            new Vesicle(random.LogBetween(1000, 8000), random.Between(-14, 14), random.Between(-14, 14)))],
    };

    private static Light Scene(List<Cell> cells, int channel)
    {
        Light light = new(Size, Size);
        Array.Fill(light.Electrons, Background[channel]);
        // The cell body is twice as wide as its nucleus.
        double width = channel == 0 ? 1 : 2;
        foreach (Cell cell in cells)
            light.AddBlob(cell.Peaks[channel], cell.X, cell.Y, width * cell.Long, width * cell.Short, cell.Heading);
        return light;
    }

    private static void AddVesicles(TruthTable table, int frame, List<Cell> cells, Light light, RandomSource random)
    {
        foreach (Vesicle vesicle in cells.SelectMany(cell => cell.Vesicles.Select(v =>
            v with { OffsetX = cell.X + v.OffsetX + random.Between(-1, 1), OffsetY = cell.Y + v.OffsetY + random.Between(-1, 1) })))
        {
            light.AddPointSource(vesicle.Flux, vesicle.OffsetX, vesicle.OffsetY, Fwhm);
            table.Add(TruthTable.Number(frame), TruthTable.Number(vesicle.Flux, 1), TruthTable.Number(vesicle.OffsetX, 4),
                TruthTable.Number(vesicle.OffsetY, 4), TruthTable.Number(Fwhm, 2));
        }
    }

    private static double[] Expose(ImpulseTruth impulses, int frame, Light light, int channel, List<Cell> cells, RandomSource random)
    {
        ImpulseField field = new(light, Background[channel], Detectors[channel]);
        foreach (Cell cell in cells)
            field.PlantOnLight(impulses, frame, cell.X + random.Between(-10, 10), cell.Y + random.Between(-10, 10), random);
        for (int i = 0; i < 3; i++)
            field.PlantAnywhere(impulses, frame, "track", ImpulseShapes.Track(random), random);
        for (int i = 0; i < 30; i++)
            field.PlantAnywhere(impulses, frame, "isolated", ImpulseShapes.Single(), random);
        return Detectors[channel].Expose(light, field.Charge, random);
    }

    // A persistent walk: the heading turns a little at each step and is reflected at the edge of the field.
    private static void Move(Cell cell, RandomSource random)
    {
        (double turnX, double turnY) = random.Direction();
        double x = cell.Heading.X + (0.4 * turnX), y = cell.Heading.Y + (0.4 * turnY), length = Math.Sqrt((x * x) + (y * y));
        (x, y) = (x / length, y / length);
        if (cell.X + (cell.Speed * x) is < 15 or > Size - 15)
            x = -x;
        if (cell.Y + (cell.Speed * y) is < 15 or > Size - 15)
            y = -y;
        cell.Heading = (x, y);
        cell.X += cell.Speed * x;
        cell.Y += cell.Speed * y;
    }

    private static void AddCells(TruthTable table, int time, List<Cell> cells)
    {
        for (int i = 0; i < cells.Count; i++)
        {
            Cell cell = cells[i];
            table.Add(TruthTable.Number(time), TruthTable.Number(i), TruthTable.Number(cell.X, 4), TruthTable.Number(cell.Y, 4),
                TruthTable.Number(cell.Long, 3), TruthTable.Number(cell.Short, 3), TruthTable.Number(cell.Peaks[0], 1), TruthTable.Number(cell.Peaks[1], 1));
        }
    }

    private static string Xml()
    {
        StringBuilder planes = new();
        for (int time = 0; time < Times; time++)
        {
            for (int channel = 0; channel < 2; channel++)
            {
                planes.Append(CultureInfo.InvariantCulture,
                    $"""<TiffData FirstZ="0" FirstC="{channel}" FirstT="{time}" IFD="{(time * 2) + channel}" PlaneCount="1"/>""").Append('\n');
            }
        }

        for (int time = 0; time < Times; time++)
        {
            for (int channel = 0; channel < 2; channel++)
            {
                planes.Append(CultureInfo.InvariantCulture,
                    $"""<Plane TheZ="0" TheC="{channel}" TheT="{time}" DeltaT="{time * SecondsPerFrame}" DeltaTUnit="s" ExposureTime="80" ExposureTimeUnit="ms"/>""").Append('\n');
            }
        }

        return string.Create(CultureInfo.InvariantCulture, $"""
            <?xml version="1.0" encoding="UTF-8"?>
            <OME xmlns="http://www.openmicroscopy.org/Schemas/OME/2016-06" xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance" xsi:schemaLocation="http://www.openmicroscopy.org/Schemas/OME/2016-06 http://www.openmicroscopy.org/Schemas/OME/2016-06/ome.xsd" UUID="urn:uuid:5b1f3c52-7f0e-4d0b-9a55-0c7a7f6f2d11">
            <Image ID="Image:0" Name="wandering cells">
            <AcquisitionDate>2025-04-02T09:30:00</AcquisitionDate>
            <Description>Simulated time-lapse of an invented bench: Ferrow Lane cell laboratory, stage 3. Pixels of {PixelMicrometres} µm.</Description>
            <Pixels ID="Pixels:0" DimensionOrder="XYCZT" Type="uint16" SignificantBits="16" BigEndian="false" Interleaved="false" SizeX="{Size}" SizeY="{Size}" SizeZ="1" SizeC="2" SizeT="{Times}" PhysicalSizeX="{PixelMicrometres}" PhysicalSizeXUnit="µm" PhysicalSizeY="{PixelMicrometres}" PhysicalSizeYUnit="µm" TimeIncrement="{SecondsPerFrame}" TimeIncrementUnit="s">
            <Channel ID="Channel:0:0" Name="{ChannelNames[0]}" SamplesPerPixel="1" ExcitationWavelength="395" ExcitationWavelengthUnit="nm" EmissionWavelength="460" EmissionWavelengthUnit="nm"/>
            <Channel ID="Channel:0:1" Name="{ChannelNames[1]}" SamplesPerPixel="1" ExcitationWavelength="488" ExcitationWavelengthUnit="nm" EmissionWavelength="525" EmissionWavelengthUnit="nm"/>
            {planes}</Pixels>
            </Image>
            </OME>
            """);
    }
}
