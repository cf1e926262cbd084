using Stacks.TestSupport;

namespace Stacks.Tests.Tiff;

/// <summary>
/// An OME-TIFF set of a file a channel, 2 channels x 3 along z x 2 times, written from the specification's text: each file
/// has the whole text with its own UUID as root, or points to a companion. The first sample of a plane tells its place.
/// </summary>
internal static class OmeSetFiles
{
    public const string Schema = "http://www.openmicroscopy.org/Schemas/OME/2016-06";
    public const int Width = 7;
    public const int Height = 5;

    public static string Uuid(int channel) => $"urn:uuid:0000000{channel}-1111-4222-8333-444444444444";

    public static string Name(int channel) => $"cells_c{channel}.ome.tif";

    /// <summary>The whole text; its root has a UUID of its own.</summary>
    public static string Text(string order, string rootUuid) =>
        $"""
        <?xml version="1.0" encoding="UTF-8"?>
        <OME xmlns="{Schema}" UUID="{rootUuid}">
          <Image ID="Image:0" Name="cells µ">
            <Pixels ID="Pixels:0" DimensionOrder="{order}" Type="uint16" SizeX="{Width}" SizeY="{Height}" SizeC="2" SizeZ="3" SizeT="2" PhysicalSizeX="0.65" PhysicalSizeXUnit="µm">
              <Channel ID="Channel:0:0" Name="DAPI" SamplesPerPixel="1"/><Channel ID="Channel:0:1" Name="GFP" SamplesPerPixel="1"/>
              {string.Join("\n      ", from c in Enumerable.Range(0, 2) from p in Enumerable.Range(0, 6) select $"""<TiffData FirstC="{c}" FirstZ="{p % 3}" FirstT="{p / 3}" IFD="{p}" PlaneCount="1"><UUID FileName="{Name(c)}">{Uuid(c)}</UUID></TiffData>""")}
            </Pixels>
          </Image>
        </OME>
        """;

    public static int Sample(int c, int z, int t) => 1000 + (100 * c) + (10 * z) + t;

    /// <summary>Writes the two files; with a companion where one is named.</summary>
    public static string Write(TemporaryFolder folder, string order = "XYZCT", string? companion = null)
    {
        for (int c = 0; c < 2; c++)
        {
            string text = companion is null
                ? Text(order, Uuid(c))
                : $"""<?xml version="1.0" encoding="UTF-8"?><OME xmlns="{Schema}" UUID="{Uuid(c)}"><BinaryOnly MetadataFile="{companion}" UUID="urn:uuid:00000009-1111-4222-8333-444444444444"/></OME>""";
            TinyPage[] pages = [.. Enumerable.Range(0, 6).Select(p => new TinyPage
            {
                Width = Width,
                Height = Height,
                Bits = 16,
                Samples = [.. Enumerable.Range(0, Width * Height).SelectMany(i => BitConverter.GetBytes((ushort)(Sample(c, p % 3, p / 3) + (i == 0 ? 0 : i * 37))))],
                Extra = p == 0 ? [TinyTag.Text(270, text)] : [],
            })];
            File.WriteAllBytes(folder.File(Name(c)), TinyTiff.Build(false, false, pages));
        }

        if (companion is not null)
            File.WriteAllText(folder.File(companion), Text(order, "urn:uuid:00000009-1111-4222-8333-444444444444"));
        return folder.File(Name(0));
    }
}
