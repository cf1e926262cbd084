using System.Xml.Linq;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.Tests.Cli;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

/// <summary>OME-TIFF sets of several files, with and without a companion: one stack, one result.</summary>
public sealed class OmeSetTests : IDisposable
{
    private const string Companion = "cells.companion.ome";
    private readonly TemporaryFolder folder = new();
    private readonly CliBench bench = new();

    public void Dispose()
    {
        folder.Dispose();
        bench.Dispose();
    }

    /// <summary>From the definition of DimensionOrder: the first letter after XY runs fastest.</summary>
    [Theory]
    [InlineData("XYZCT")]
    [InlineData("XYZTC")]
    [InlineData("XYCZT")]
    [InlineData("XYCTZ")]
    [InlineData("XYTCZ")]
    [InlineData("XYTZC")]
    public void Planes_come_in_the_order_of_the_text_from_whichever_file_is_named(string order)
    {
        OmeSetFiles.Write(folder, order);
        for (int named = 0; named < 2; named++)
        {
            using IStackReader reader = Open(OmeSetFiles.Name(named));
            Assert.Equal((12, 1), (reader.FrameCount, reader.OtherFiles.Count));
            Dictionary<char, int> size = new() { ['C'] = 2, ['Z'] = 3, ['T'] = 2 };
            for (int frame = 0; frame < 12; frame++)
            {
                int fast = size[order[2]], middle = size[order[3]];
                Dictionary<char, int> at = new() { [order[2]] = frame % fast, [order[3]] = frame / fast % middle, [order[4]] = frame / fast / middle };
                FrameLayout layout = reader.Layout(frame);
                Assert.Equal((at['C'], at['Z'], at['T']), (layout.Channel, layout.Z, layout.Time));
                Assert.Equal(at['C'] == 0 ? "DAPI" : "GFP", layout.ChannelName);
                Assert.Equal(OmeSetFiles.Sample(at['C'], at['Z'], at['T']), BitConverter.ToUInt16(PassThrough.Stored(reader, frame)));
            }

            Assert.DoesNotContain(reader.CheckHealth(default), f => f.IsProblem);
        }
    }

    [Theory]
    [InlineData(Companion)]
    [InlineData("cells_c1.ome.tif")]
    public void A_companion_describes_the_set(string named)
    {
        OmeSetFiles.Write(folder, companion: Companion);
        Assert.True(new TiffFormat().Recognises(File.ReadAllBytes(folder.File(Companion)).AsSpan(0, 400)));
        using IStackReader reader = Open(named);

        Assert.Equal(12, reader.FrameCount);
        Assert.Equal(new[] { Companion, "cells_c0.ome.tif", "cells_c1.ome.tif" }.Where(n => n != named).Order(), reader.OtherFiles.Select(Path.GetFileName).Order());
        Assert.Contains(new HeaderFact("pixel width", "0.65 µm"), reader.Facts);
    }

    [Theory]
    [InlineData(null)]
    [InlineData(Companion)]
    public void The_result_is_one_file_whose_text_points_into_it(string? companion)
    {
        string named = OmeSetFiles.Write(folder, "XYCZT", companion);
        HostRun.Of("", named, folder.File("result.ome.tif"));

        using IStackReader source = Open(OmeSetFiles.Name(0)), result = Open("result.ome.tif");
        Assert.IsType<TiffReader>(result);
        Assert.Empty(result.OtherFiles);
        for (int frame = 0; frame < 12; frame++)
        {
            Assert.Equal(PassThrough.Stored(source, frame), PassThrough.Stored(result, frame));
            Assert.Equal(source.Layout(frame), result.Layout(frame));
        }

        Assert.DoesNotContain(result.CheckHealth(default), f => f.IsProblem);

        // But for the links, the UUID and the annotation the text is the source's.
        string before = OmeSetFiles.Text("XYCZT", "U"), after = ((TiffReader)result).Metadata.Ome!.Xml.Text;
        XElement was = XDocument.Parse(before).Root!, now = XDocument.Parse(after).Root!;
        Assert.DoesNotContain("cells_c0", after.Replace("from cells_c0.ome.tif", "", StringComparison.Ordinal).Replace(">cells_c0.ome.tif<", "", StringComparison.Ordinal), StringComparison.Ordinal);
        Assert.Equal(Enumerable.Range(0, 12), now.Descendants().Where(e => e.Name.LocalName == "TiffData").Select(e => (int)e.Attribute("IFD")!).Order());
        foreach (XElement root in new[] { was, now })
        {
            root.SetAttributeValue("UUID", null);
            root.Descendants().Where(e => e.Name.LocalName is "TiffData" or "StructuredAnnotations").Remove();
        }

        Assert.True(XNode.DeepEquals(was, now));
    }

    [Fact]
    public void Every_file_of_the_set_is_in_the_provenance_and_in_the_works_digest()
    {
        string named = OmeSetFiles.Write(folder);
        string first = HostRun.Of("", named, folder.File("a.ome.tif")).Provenance!.WorkDigest;
        string sidecar = File.ReadAllText(folder.File("a.ome.tif.prov.json"));
        Assert.Contains("\"stacks:source2\"", sidecar, StringComparison.Ordinal);
        Assert.Contains(Convert.ToHexStringLower(System.Security.Cryptography.SHA256.HashData(File.ReadAllBytes(folder.File(OmeSetFiles.Name(1))))), sidecar, StringComparison.Ordinal);

        byte[] other = File.ReadAllBytes(folder.File(OmeSetFiles.Name(1)));
        other[^1] ^= 1;
        File.WriteAllBytes(folder.File(OmeSetFiles.Name(1)), other);
        Assert.NotEqual(first, HostRun.Of("", named, folder.File("a.ome.tif")).Provenance!.WorkDigest);
    }

    [Fact]
    public void A_folder_with_a_set_is_run_once()
    {
        OmeSetFiles.Write(folder, companion: Companion);
        ToolResult result = Tool.Stacks("run", bench.Recipe(), folder.Path, "-o", folder.File("out"));

        Assert.Equal(0, result.ExitCode);
        Assert.Contains("1 stack: 1 made, 0 done before, 0 failed, 2 files of another's stack", result.Output, StringComparison.Ordinal);
        Assert.Contains("a file of the stack of", result.Output, StringComparison.Ordinal);
        Assert.Equal(["cells.companion.ome.tif", "cells.companion.ome.tif.prov.json"], Directory.GetFiles(folder.File("out")).Select(Path.GetFileName).Order());
        Assert.Contains(": tiff, 12 frames", Tool.Stacks("inspect", folder.Path).Output, StringComparison.Ordinal);
    }

    [Fact]
    public void A_missing_file_is_named_with_what_it_held()
    {
        string named = OmeSetFiles.Write(folder);
        File.Delete(folder.File(OmeSetFiles.Name(1)));

        Assert.Contains("the file cells_c1.ome.tif of the OME set is missing, and with it 6 planes", Assert.Throws<StackFormatException>(() => Open(OmeSetFiles.Name(0))).Message, StringComparison.Ordinal);
        RunResult(named);

        void RunResult(string path)
        {
            ToolResult result = bench.Run(bench.Recipe(), path, "--salvage");
            Assert.Equal(0, result.ExitCode);
            Assert.Contains("salvaged: the file cells_c1.ome.tif of the OME set is missing", result.Output, StringComparison.Ordinal);
            using IStackReader made = new TiffFormat().Open(Path.Combine(bench.Out, OmeSetFiles.Name(0)), new ReadOptions());
            Assert.Equal(6, made.FrameCount);
            Assert.All(Enumerable.Range(0, 6), f => Assert.Equal("DAPI", made.Layout(f).ChannelName));
        }
    }

    [Fact]
    public void Pages_without_a_place_are_named_as_left_out()
    {
        string named = OmeSetFiles.Write(folder);
        string text = System.Text.Encoding.Latin1.GetString(File.ReadAllBytes(named));
        string link = $"""<TiffData FirstC="1" FirstZ="2" FirstT="1" IFD="5" PlaneCount="1"><UUID FileName="{OmeSetFiles.Name(1)}">{OmeSetFiles.Uuid(1)}</UUID></TiffData>""";
        Assert.Contains(link, text, StringComparison.Ordinal);
        File.WriteAllText(named, text.Replace(link, new string(' ', link.Length), StringComparison.Ordinal), System.Text.Encoding.Latin1);

        ToolResult result = bench.Run(bench.Recipe(), named);
        Assert.Equal(0, result.ExitCode);
        Assert.Contains("cells_c0.ome.tif: 11 frames", result.Output, StringComparison.Ordinal);
        Assert.Contains("not carried: cells_c1.ome.tif (other pages, 1 pages without a place in the set)", result.Output, StringComparison.Ordinal);
    }

    [Fact]
    public void A_companion_of_another_set_is_refused()
    {
        OmeSetFiles.Write(folder, companion: Companion);
        string text = File.ReadAllText(folder.File(Companion));
        File.WriteAllText(folder.File(Companion), text.Replace("00000009-1111", "0000000a-1111", StringComparison.Ordinal));

        Assert.Contains("wants urn:uuid:00000009-1111-4222-8333-444444444444 of this name", Assert.Throws<StackFormatException>(() => Open(OmeSetFiles.Name(0))).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Links_that_lead_elsewhere_and_files_of_another_name_are_refused()
    {
        string named = OmeSetFiles.Write(folder);
        byte[] whole = File.ReadAllBytes(named);
        string text = System.Text.Encoding.Latin1.GetString(whole);

        foreach (string name in new[] { "../lls_c1.ome.ti", "/etc/c1.ome.tiff", "c\\lls_c1.ome.tif" })
        {
            File.WriteAllText(named, text.Replace(OmeSetFiles.Name(1), name, StringComparison.Ordinal), System.Text.Encoding.Latin1);
            Assert.Contains("no plain file name", Assert.Throws<StackFormatException>(() => Open(OmeSetFiles.Name(0))).Message, StringComparison.Ordinal);
        }

        File.WriteAllText(named, text.Replace(OmeSetFiles.Uuid(1), OmeSetFiles.Uuid(7), StringComparison.Ordinal), System.Text.Encoding.Latin1);
        Assert.Contains($"it is {OmeSetFiles.Uuid(1)}, the OME set wants {OmeSetFiles.Uuid(7)}", Assert.Throws<StackFormatException>(() => Open(OmeSetFiles.Name(0))).Message, StringComparison.Ordinal);

        File.WriteAllBytes(named, whole);
        bench.Refused(Tool.Stacks("run", bench.Recipe(), named, "-o", folder.File(OmeSetFiles.Name(1)), "--overwrite"), 73, "would overwrite");
    }

    [Fact]
    public void A_text_that_names_the_same_pages_over_and_over_is_refused()
    {
        OmeSetFiles.Write(folder, companion: Companion);
        string text = File.ReadAllText(folder.File(Companion));
        string again = string.Concat(Enumerable.Range(0, 50).Select(t => $"""<TiffData FirstT="{t}" IFD="0" PlaneCount="3"><UUID FileName="{OmeSetFiles.Name(0)}">{OmeSetFiles.Uuid(0)}</UUID></TiffData>"""));
        File.WriteAllText(folder.File(Companion), text.Replace("SizeT=\"2\"", "SizeT=\"100\"", StringComparison.Ordinal).Replace("</Pixels>", again + "</Pixels>", StringComparison.Ordinal));
        Assert.Contains("again and again", Assert.Throws<StackFormatException>(() => Open(Companion)).Message, StringComparison.Ordinal);
    }

    [Fact]
    public void Companions_that_are_broken_hostile_or_absent_are_refused()
    {
        OmeSetFiles.Write(folder, companion: Companion);
        foreach (string text in new[] { "<OME", "<OME/>", "<!DOCTYPE OME [<!ENTITY a 'b'>]><OME>&a;</OME>", "<OME><BinaryOnly MetadataFile=\"x\"/></OME>", "<OME><Image><Pixels SizeC=\"9\"><TiffData/></Pixels></Image></OME>" })
        {
            File.WriteAllText(folder.File(Companion), text);
            Assert.Contains("cells", Assert.Throws<StackFormatException>(() => Open(Companion)).Message, StringComparison.Ordinal);
        }

        File.Delete(folder.File(Companion));
        Assert.Contains("cells.companion.ome, which is not beside it", Assert.Throws<StackFormatException>(() => Open(OmeSetFiles.Name(0))).Message, StringComparison.Ordinal);
    }

    private IStackReader Open(string name) => new TiffFormat().Open(folder.File(name), new ReadOptions());
}
