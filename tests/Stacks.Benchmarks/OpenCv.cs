using OpenCvSharp;
using Stacks.Abstractions;

namespace Stacks.Benchmarks;

/// <summary>OpenCV through OpenCvSharp4, where its native library loads (Debian: libgtk-3-0).</summary>
internal static class OpenCv
{
    /// <summary>Why it is not here; null when it is.</summary>
    public static string? Missing { get; } = WhyMissing();

    /// <summary>A matrix of a plane's samples: ushort, short or float.</summary>
    public static Mat MatOf<T>(Plane<T> plane)
        where T : unmanaged
    {
        Mat matrix = new(plane.Height, plane.Width, default(T) switch { ushort => MatType.CV_16UC1, short => MatType.CV_16SC1, byte => MatType.CV_8UC1, _ => MatType.CV_32FC1 });
        matrix.SetArray(plane.Samples.ToArray());
        return matrix;
    }

    /// <summary>A call from one matrix to another with so many of OpenCV's threads.</summary>
    public static Action Call<T>(Plane<T> plane, Action<Mat, Mat> call, int threads = 1)
        where T : unmanaged
    {
        Mat source = MatOf(plane), result = new();
        return () =>
        {
            Cv2.SetNumThreads(threads);
            call(source, result);
        };
    }

    private static string? WhyMissing()
    {
        try
        {
            Cv2.GetVersionString();
            return null;
        }
        catch (Exception error) when (error is TypeInitializationException or DllNotFoundException or OpenCvSharpException)
        {
            return "OpenCV's native library is not here";
        }
    }
}
