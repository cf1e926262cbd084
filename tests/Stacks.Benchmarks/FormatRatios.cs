using BitMiracle.LibTiff.Classic;
using Microsoft.Win32.SafeHandles;
using Stacks.Abstractions;
using Stacks.Formats.Fits;
using Stacks.Formats.Tiff;
using Stacks.TestSupport;

namespace Stacks.Benchmarks;

/// <summary>Reading and writing against what others need for the same file.</summary>
internal static class FormatRatios
{
    private const int Frames = 24;
    private const int TiffFrames = 4;
    private const int Threads = 2;

    /// <summary>The rows.</summary>
    public static IEnumerable<Ratio> Of(Scene scene)
    {
        string plain = scene.File("plain.fits");
        Write(new FitsFormat(), scene.Stack(Frames), plain, OutputCompression.None, 1);
        yield return Ratio.Of(
            "read uncompressed FITS, two threads, to a plain read of the file into memory, one thread", 0.8, () => ReadAll(new FitsFormat(), plain), () => ReadPlainly(plain));

        string packed = scene.File("rice.fits");
        if (Needs.Missing(["fpack", "funpack"]) is null)
        {
            Tool.Run("fpack", "-r", "-O", packed, plain);
            yield return Ratio.Of(
                "read RICE_1, two threads, to funpack", 1.0, () => ReadAll(new FitsFormat(), packed), () => Tool.Run("sh", "-c", $"funpack -S {packed} > /dev/null"));
        }

        IStackReader stack = scene.Stack(TiffFrames);
        string ours = scene.File("ours.tif"), theirs = scene.File("theirs.tif");
        yield return Ratio.Of(
            "write Deflate, two threads, to LibTiff.NET's BigTIFF", 8, () => Write(new TiffFormat(), stack, ours, OutputCompression.Deflate, Threads), () => WriteWithLibTiff(stack, theirs));
    }

    /// <summary>Reads and decodes every frame, a thread taking the next that is left.</summary>
    private static void ReadAll(FitsFormat format, string path)
    {
        using IStackReader reader = format.Open(path, new ReadOptions());
        EachFrame(Threads, reader.FrameCount, (frame, memory) =>
        {
            reader.Read(frame, memory.Raw);
            reader.Decode(frame, memory.Raw.Written, memory.Stored.Resize((int)reader.Layout(frame).StoredBytes));
        });
    }

    /// <summary>Reads as many bytes in pieces of a frame.</summary>
    private static void ReadPlainly(string path)
    {
        using SafeFileHandle file = File.OpenHandle(path);
        int bytes = (int)Scene.Layout.StoredBytes;
        EachFrame(1, Frames, (frame, memory) => RandomAccess.Read(file, memory.Stored.Resize(bytes), (long)frame * bytes));
    }

    /// <summary>Memory of a thread is used again from round to round, as a run uses it from frame to frame.</summary>
    private static void EachFrame(int threads, int count, Action<int, ThreadMemory> read)
    {
        int next = -1;
        Parallel.For(0, threads, new ParallelOptions { MaxDegreeOfParallelism = threads }, thread =>
        {
            for (int frame = Interlocked.Increment(ref next); frame < count; frame = Interlocked.Increment(ref next))
                read(frame, Memories[thread]);
        });
    }

    private static ThreadMemory[] Memories { get; } = [.. Enumerable.Range(0, Threads).Select(_ => new ThreadMemory(new ByteBuffer(), new ByteBuffer()))];

    private sealed record ThreadMemory(ByteBuffer Raw, ByteBuffer Stored);

    /// <summary>Encodes a group of frames on so many threads, then writes them in order, group after group.</summary>
    internal static void Write(IStackFormat format, IStackReader source, string path, OutputCompression compression, int threads)
    {
        using IStackWriter writer = format.Create(new WriteRequest
        {
            Source = source,
            Path = path,
            SampleTypeOf = frame => source.Layout(frame).SampleType,
            Compression = compression,
            Created = PassThrough.Created,
        });
        byte[] flags = new byte[Scene.Layout.Length];
        EncodedFrame[] encoded = [.. Enumerable.Range(0, threads).Select(_ => new EncodedFrame())];
        for (int first = 0; first < source.FrameCount; first += threads)
        {
            int count = Math.Min(threads, source.FrameCount - first);
            Parallel.For(0, count, i => writer.Encode(first + i, PassThrough.Stored(source, first + i), flags, encoded[i]));
            for (int i = 0; i < count; i++)
                writer.Write(first + i, encoded[i]);
        }

        writer.Complete(PassThrough.Provenance(source), []);
        File.Move(writer.Files[0].Partial, path, overwrite: true);
    }

    /// <summary>The same pages with LibTiff.NET 2.4.660: BigTIFF, Deflate, horizontal predictor, strips of 64 rows.</summary>
    private static void WriteWithLibTiff(IStackReader source, string path)
    {
        using Tiff tiff = Tiff.Open(path, "w8");
        for (int frame = 0; frame < source.FrameCount; frame++)
        {
            byte[] stored = PassThrough.Stored(source, frame);
            tiff.SetField(TiffTag.IMAGEWIDTH, Scene.Side);
            tiff.SetField(TiffTag.IMAGELENGTH, Scene.Side);
            tiff.SetField(TiffTag.BITSPERSAMPLE, 16);
            tiff.SetField(TiffTag.SAMPLESPERPIXEL, 1);
            tiff.SetField(TiffTag.PHOTOMETRIC, Photometric.MINISBLACK);
            tiff.SetField(TiffTag.PLANARCONFIG, PlanarConfig.CONTIG);
            tiff.SetField(TiffTag.ROWSPERSTRIP, 64);
            tiff.SetField(TiffTag.COMPRESSION, BitMiracle.LibTiff.Classic.Compression.ADOBE_DEFLATE);
            tiff.SetField(TiffTag.PREDICTOR, BitMiracle.LibTiff.Classic.Predictor.HORIZONTAL);
            int strip = 64 * Scene.Side * 2;
            for (int s = 0; s < Scene.Side / 64; s++)
            {
                byte[] rows = stored.AsSpan(s * strip, strip).ToArray();
                tiff.WriteEncodedStrip(s, rows, strip);
            }

            tiff.WriteDirectory();
        }
    }
}
