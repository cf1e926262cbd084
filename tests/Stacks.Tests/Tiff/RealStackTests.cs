using System.Buffers.Binary;
using Stacks.Abstractions;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;
using Xunit;

namespace Stacks.Tests.Tiff;

public sealed class RealStackTests
{
    private readonly TiffFormat format = new();

    /// <summary>Sum and number of saturated samples from the data folder's README.</summary>
    [NeedsFact(Needs.RealDataNeed)]
    public void Migration_stack_has_its_known_sum_and_comes_back_bit_for_bit()
    {
        using TemporaryFolder folder = new();
        using IStackReader reader = format.Open(RealData.File("micro", "cancer_cell_migration_crop.tif"), new ReadOptions());
        Assert.Equal(48, reader.FrameCount);
        Assert.Equal((130, 130, SampleType.UInt16), (reader.Layout(47).Width, reader.Layout(47).Height, reader.Layout(47).SampleType));
        long sum = 0;
        int full = 0;
        for (int f = 0; f < 48; f++)
        {
            byte[] stored = TiffLoop.Samples(reader, f);
            for (int i = 0; i < stored.Length; i += 2)
            {
                ushort sample = BinaryPrimitives.ReadUInt16LittleEndian(stored.AsSpan(i));
                sum += sample;
                full += sample == 65535 ? 1 : 0;
            }
        }

        Assert.Equal(6998463282, sum);
        Assert.Equal(55, full);

        string copy = TiffLoop.Copy(reader, folder.File("copy.tif"))[0];
        using IStackReader again = format.Open(copy, new ReadOptions());
        Assert.Equal(48, again.FrameCount);
        for (int f = 0; f < 48; f++)
            Assert.Equal(TiffLoop.Samples(reader, f), TiffLoop.Samples(again, f));
    }
}
