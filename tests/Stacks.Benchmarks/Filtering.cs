using Stacks.Abstractions;
using Stacks.Imaging;
using Stacks.TestSupport;

namespace Stacks.Benchmarks;

/// <summary>A filter on one plane, again and again as a run does it frame after frame: memory is rented once.</summary>
internal static class Filtering
{
    /// <summary>The work of one frame; it ends with the output plane written.</summary>
    /// <param name="filter">The filter.</param>
    /// <param name="input">The frame.</param>
    /// <param name="flags">What is missing; null for nothing.</param>
    /// <param name="threads">Row bands that run side by side.</param>
    /// <param name="given">Parameters as a recipe would give them.</param>
    public static Action Of<T>(IFilterPlugin filter, Plane<T> input, Plane<SampleFlags>? flags = null, int threads = 1, params (string Name, ParameterValue Value)[] given)
        where T : unmanaged => Of(filter, input, Scene.Noise, flags, threads, given);

    /// <summary>The same with another noise model than the scene's.</summary>
    public static Action Of<T>(IFilterPlugin filter, Plane<T> input, NoiseModel noise, Plane<SampleFlags>? flags, int threads, params (string Name, ParameterValue Value)[] given)
        where T : unmanaged
    {
        IFilterStep<T> step = FilterRun.Prepare(filter, input, given);
        Plane<T> output = new(new T[input.Length], input.Width, input.Height);
        Plane<SampleFlags> found = new(new SampleFlags[input.Length], input.Width, input.Height);
        Scratch scratch = new();
        FrameContext context = new()
        {
            FrameIndex = 0,
            Noise = noise,
            HasMissing = flags is not null,
            Bands = threads == 1 ? SerialBands.Instance : new ParallelBands(threads),
            Scratch = scratch,
        };
        return () =>
        {
            // A selective step leaves its decisions in the flags, and finds none of the last round.
            if (flags is { } known)
                known.Samples.CopyTo(found.Samples);
            else
                found.Samples.Clear();
            step.Apply(input, found, output, context);
            scratch.Reset();
        };
    }
}
