using Stacks.Tests.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.ReferenceTests.Tiff;

/// <summary>Results with OME-XML against tifffile, which reads the axes for itself, and against a schema.</summary>
public sealed class OmeReferenceTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    /// <summary>tifffile arranges the planes by the text of the result; the first sample of each tells its place.</summary>
    [NeedsTheory(Needs.Tifffile)]
    [InlineData("XYZCT")]
    [InlineData("XYZTC")]
    [InlineData("XYCZT")]
    [InlineData("XYCTZ")]
    [InlineData("XYTCZ")]
    [InlineData("XYTZC")]
    public void A_set_put_into_one_file_has_the_axes_that_tifffile_reads(string order)
    {
        HostRun.Of("", OmeSetFiles.Write(folder, order), folder.File("result.ome.tif"));

        ToolResult result = Tool.Run(Tool.Python, "-c",
            """
            import sys, numpy as np, tifffile
            with tifffile.TiffFile(sys.argv[1]) as t:
                assert t.is_ome and len(t.pages) == 12 and len(t.series) == 1
                s = t.series[0]
                data = s.asarray()
                order = [s.axes.index(a) for a in 'TZCYX']
                data = data.transpose(order)
                assert data.shape == (2, 3, 2, 5, 7), data.shape
                for t_ in range(2):
                    for z in range(3):
                        for c in range(2):
                            assert data[t_, z, c, 0, 0] == 1000 + 100 * c + 10 * z + t_, (t_, z, c)
                print(s.axes)
            """, folder.File("result.ome.tif"));
        Assert.Equal((0, ""), (result.ExitCode, result.Error));
    }

    [NeedsFact(Needs.RealDataNeed, Needs.Tifffile)]
    public void A_real_stack_keeps_axes_and_samples()
    {
        string source = RealData.File("micro", "multi-channel-z-series.ome.tif");
        HostRun.Of("", source, folder.File("result.ome.tif"));

        ToolResult result = Tool.Run(Tool.Python, "-c",
            """
            import sys, numpy as np, tifffile
            with tifffile.TiffFile(sys.argv[1]) as a, tifffile.TiffFile(sys.argv[2]) as b:
                assert [(s.axes, s.shape, s.dtype) for s in a.series] == [(s.axes, s.shape, s.dtype) for s in b.series]
                for x, y in zip(a.series, b.series):
                    assert (x.asarray() == y.asarray()).all()
                print(a.series[0].axes, a.series[0].shape)
            """, source, folder.File("result.ome.tif"));
        Assert.Equal((0, ""), (result.ExitCode, result.Error));
    }

    /// <summary>
    /// Colour along z and in time as tifffile writes it: three samples a pixel on one page. The levels tell sample, z and time;
    /// a step on channel 1 raises that sample of every page alone.
    /// </summary>
    [NeedsFact(Needs.Tifffile)]
    public void Samples_of_a_pixel_are_channels_in_every_page()
    {
        string source = folder.File("colour.ome.tif");
        ToolResult written = Tool.Run(Tool.Python, "-c",
            """
            import sys, numpy as np, tifffile
            t, z, y, x, s = np.indices((2, 3, 8, 9, 3))
            tifffile.imwrite(sys.argv[1], (50 * t + 10 * z + s + 100 * ((x + y) % 2)).astype(np.uint8), photometric='rgb', ome=True, metadata={'axes': 'TZYXS'})
            """, source);
        Assert.Equal((0, ""), (written.ExitCode, written.Error));
        HostRun.Of("[output]\nsamples = \"same\"\n[[step]]\nfilter = \"maximum\"\nchannel = 1\n", source, folder.File("result.ome.tif"));

        ToolResult result = Tool.Run(Tool.Python, "-c",
            """
            import sys, numpy as np, tifffile
            with tifffile.TiffFile(sys.argv[1]) as a, tifffile.TiffFile(sys.argv[2]) as b:
                before, after = (f.series[0].asarray().transpose([f.series[0].axes.index(c) for c in 'TZSYX']) for f in (a, b))
            assert before.shape == after.shape == (2, 3, 3, 8, 9), (before.shape, after.shape)
            assert (before[:, :, [0, 2]] == after[:, :, [0, 2]]).all()
            assert (after[:, :, 1] == before[:, :, 1].max(axis=(2, 3), keepdims=True)).all()
            """, source, folder.File("result.ome.tif"));
        Assert.Equal((0, ""), (result.ExitCode, result.Error));
    }

    /// <summary>
    /// The elements and attributes that results change or gain, as the published OME schema of 2016-06 describes them
    /// (order of elements, patterns of identifiers, enumerations), written anew here; all others pass.
    /// </summary>
    [NeedsFact("xmllint", Needs.Tifffile)]
    public void Results_validate_against_the_elements_of_the_schema()
    {
        File.WriteAllText(folder.File("ome.xsd"), Schema);
        List<string> sources = [OmeSetFiles.Write(folder), Path.Combine(Checkout.Root, "sample-stacks", "wandering-cells.ome.tif")];
        if (RealData.Folder is not null)
            sources.Add(RealData.File("micro", "multi-channel-z-series.ome.tif"));
        foreach (string source in sources)
        {
            foreach (string recipe in new[] { "", "[output]\nsamples = \"float32\"\n", "[output]\ncompression = \"zstd\"\n" })
            {
                HostRun.Of(recipe, source, folder.File("result.ome.tif"));
                ToolResult text = Tool.Run(Tool.Python, "-c", "import sys, tifffile\nsys.stdout.buffer.write(tifffile.TiffFile(sys.argv[1]).pages[0].description.encode())", folder.File("result.ome.tif"));
                Assert.Equal((0, ""), (text.ExitCode, text.Error));
                File.WriteAllText(folder.File("result.xml"), text.Output);
                ToolResult result = Tool.Run("xmllint", "--noout", "--schema", folder.File("ome.xsd"), folder.File("result.xml"));
                Assert.True(result.ExitCode == 0, $"{source}, {recipe}: {result.Error}");
            }
        }

        // The schema can tell.
        File.WriteAllText(folder.File("result.xml"), File.ReadAllText(folder.File("result.xml")).Replace("DimensionOrder=\"XY", "DimensionOrder=\"YX", StringComparison.Ordinal));
        Assert.NotEqual(0, Tool.Run("xmllint", "--noout", "--schema", folder.File("ome.xsd"), folder.File("result.xml")).ExitCode);
    }

    private const string Schema =
        """
        <xs:schema xmlns:xs="http://www.w3.org/2001/XMLSchema" xmlns="http://www.openmicroscopy.org/Schemas/OME/2016-06" targetNamespace="http://www.openmicroscopy.org/Schemas/OME/2016-06" elementFormDefault="qualified">
          <xs:simpleType name="Uuid"><xs:restriction base="xs:string"><xs:pattern value="(urn:uuid:[0-9a-fA-F]{8}-[0-9a-fA-F]{4}-[0-9a-fA-F]{4}-[0-9a-fA-F]{4}-[0-9a-fA-F]{12})"/></xs:restriction></xs:simpleType>
          <xs:simpleType name="Order"><xs:restriction base="xs:string">
            <xs:enumeration value="XYZCT"/><xs:enumeration value="XYZTC"/><xs:enumeration value="XYCTZ"/><xs:enumeration value="XYCZT"/><xs:enumeration value="XYTCZ"/><xs:enumeration value="XYTZC"/>
          </xs:restriction></xs:simpleType>
          <xs:simpleType name="PixelType"><xs:restriction base="xs:string">
            <xs:enumeration value="int8"/><xs:enumeration value="int16"/><xs:enumeration value="int32"/><xs:enumeration value="uint8"/><xs:enumeration value="uint16"/><xs:enumeration value="uint32"/>
            <xs:enumeration value="float"/><xs:enumeration value="double"/><xs:enumeration value="complex"/><xs:enumeration value="double-complex"/><xs:enumeration value="bit"/>
          </xs:restriction></xs:simpleType>
          <xs:simpleType name="Whole"><xs:restriction base="xs:int"><xs:minInclusive value="0"/></xs:restriction></xs:simpleType>
          <xs:complexType name="Any"><xs:sequence><xs:any minOccurs="0" maxOccurs="unbounded" processContents="skip"/></xs:sequence><xs:anyAttribute processContents="skip"/></xs:complexType>
          <xs:complexType name="MixedAny" mixed="true"><xs:sequence><xs:any minOccurs="0" maxOccurs="unbounded" processContents="skip"/></xs:sequence><xs:anyAttribute processContents="skip"/></xs:complexType>
          <xs:element name="OME"><xs:complexType>
            <xs:sequence>
              <xs:choice minOccurs="0" maxOccurs="unbounded">
                <xs:element name="Rights" type="Any"/><xs:element name="Project" type="Any"/><xs:element name="Dataset" type="Any"/><xs:element name="Folder" type="Any"/><xs:element name="Experiment" type="Any"/>
                <xs:element name="Plate" type="Any"/><xs:element name="Screen" type="Any"/><xs:element name="Experimenter" type="Any"/><xs:element name="ExperimenterGroup" type="Any"/><xs:element name="Instrument" type="Any"/>
              </xs:choice>
              <xs:element name="Image" maxOccurs="unbounded"><xs:complexType>
                <xs:sequence>
                  <xs:element name="AcquisitionDate" type="xs:dateTime" minOccurs="0"/>
                  <xs:choice minOccurs="0" maxOccurs="unbounded">
                    <xs:element name="ExperimenterRef" type="Any"/><xs:element name="Description" type="MixedAny"/><xs:element name="ExperimentRef" type="Any"/><xs:element name="ExperimenterGroupRef" type="Any"/>
                    <xs:element name="InstrumentRef" type="Any"/><xs:element name="ObjectiveSettings" type="Any"/><xs:element name="ImagingEnvironment" type="Any"/><xs:element name="StageLabel" type="Any"/>
                  </xs:choice>
                  <xs:element name="Pixels"><xs:complexType>
                    <xs:sequence>
                      <xs:element name="Channel" minOccurs="0" maxOccurs="unbounded" type="Any"/>
                      <xs:element name="TiffData" minOccurs="0" maxOccurs="unbounded"><xs:complexType>
                        <xs:sequence><xs:element name="UUID" minOccurs="0"><xs:complexType><xs:simpleContent><xs:extension base="Uuid"><xs:attribute name="FileName" type="xs:string"/></xs:extension></xs:simpleContent></xs:complexType></xs:element></xs:sequence>
                        <xs:attribute name="IFD" type="Whole"/><xs:attribute name="FirstZ" type="Whole"/><xs:attribute name="FirstT" type="Whole"/><xs:attribute name="FirstC" type="Whole"/><xs:attribute name="PlaneCount" type="Whole"/>
                      </xs:complexType></xs:element>
                      <xs:element name="Plane" minOccurs="0" maxOccurs="unbounded" type="Any"/>
                    </xs:sequence>
                    <xs:attribute name="ID" use="required"><xs:simpleType><xs:restriction base="xs:string"><xs:pattern value="(urn:lsid:\S+)|(Pixels:\S+)"/></xs:restriction></xs:simpleType></xs:attribute>
                    <xs:attribute name="DimensionOrder" type="Order" use="required"/><xs:attribute name="Type" type="PixelType" use="required"/>
                    <xs:attribute name="SignificantBits" type="xs:positiveInteger"/><xs:attribute name="Interleaved" type="xs:boolean"/><xs:attribute name="BigEndian" type="xs:boolean"/>
                    <xs:attribute name="SizeX" type="xs:positiveInteger" use="required"/><xs:attribute name="SizeY" type="xs:positiveInteger" use="required"/><xs:attribute name="SizeZ" type="xs:positiveInteger" use="required"/>
                    <xs:attribute name="SizeC" type="xs:positiveInteger" use="required"/><xs:attribute name="SizeT" type="xs:positiveInteger" use="required"/>
                    <xs:attribute name="PhysicalSizeX" type="xs:float"/><xs:attribute name="PhysicalSizeY" type="xs:float"/><xs:attribute name="PhysicalSizeZ" type="xs:float"/><xs:attribute name="TimeIncrement" type="xs:float"/>
                    <xs:attribute name="PhysicalSizeXUnit" type="xs:string"/><xs:attribute name="PhysicalSizeYUnit" type="xs:string"/><xs:attribute name="PhysicalSizeZUnit" type="xs:string"/><xs:attribute name="TimeIncrementUnit" type="xs:string"/>
                  </xs:complexType></xs:element>
                  <xs:choice minOccurs="0" maxOccurs="unbounded"><xs:element name="ROIRef" type="Any"/><xs:element name="MicrobeamManipulationRef" type="Any"/><xs:element name="AnnotationRef" type="Any"/></xs:choice>
                </xs:sequence>
                <xs:attribute name="ID" use="required"><xs:simpleType><xs:restriction base="xs:string"><xs:pattern value="(urn:lsid:\S+)|(Image:\S+)"/></xs:restriction></xs:simpleType></xs:attribute>
                <xs:attribute name="Name" type="xs:string"/>
              </xs:complexType></xs:element>
              <xs:element name="StructuredAnnotations" minOccurs="0"><xs:complexType>
                <xs:choice minOccurs="0" maxOccurs="unbounded">
                  <xs:element name="XMLAnnotation"><xs:complexType>
                    <xs:sequence>
                      <xs:element name="Description" type="xs:string" minOccurs="0"/>
                      <xs:element name="AnnotationRef" type="Any" minOccurs="0" maxOccurs="unbounded"/>
                      <xs:element name="Value"><xs:complexType mixed="true"><xs:sequence><xs:any minOccurs="0" maxOccurs="unbounded" processContents="skip"/></xs:sequence></xs:complexType></xs:element>
                    </xs:sequence>
                    <xs:attribute name="ID" use="required"><xs:simpleType><xs:restriction base="xs:string"><xs:pattern value="(urn:lsid:\S+)|(Annotation:\S+)"/></xs:restriction></xs:simpleType></xs:attribute>
                    <xs:attribute name="Namespace" type="xs:anyURI"/><xs:attribute name="Annotator" type="xs:string"/>
                  </xs:complexType></xs:element>
                  <xs:element name="FileAnnotation" type="Any"/><xs:element name="ListAnnotation" type="Any"/><xs:element name="LongAnnotation" type="Any"/><xs:element name="DoubleAnnotation" type="Any"/><xs:element name="CommentAnnotation" type="Any"/><xs:element name="BooleanAnnotation" type="Any"/><xs:element name="TimestampAnnotation" type="Any"/><xs:element name="TagAnnotation" type="Any"/><xs:element name="TermAnnotation" type="Any"/><xs:element name="MapAnnotation" type="Any"/>
                </xs:choice>
              </xs:complexType></xs:element>
              <xs:element name="ROI" type="Any" minOccurs="0" maxOccurs="unbounded"/>
            </xs:sequence>
            <xs:attribute name="UUID" type="Uuid"/><xs:attribute name="Creator" type="xs:string"/><xs:anyAttribute processContents="skip" namespace="##other"/>
          </xs:complexType></xs:element>
        </xs:schema>
        """;
}
