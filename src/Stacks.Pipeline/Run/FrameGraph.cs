using System.Runtime.ExceptionServices;
using System.Threading.Tasks.Dataflow;
using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>
/// Frames from a reader through workers to a writer: source -> workers -> sink, every block bounded, order kept, never
/// more frames in flight than slots.
/// </summary>
internal sealed class FrameGraph(IStackReader reader, IStackWriter writer, int workers, int framesInFlight) : IDisposable
{
    private readonly SlotPool slots = new(framesInFlight);
    private ExceptionDispatchInfo? firstFault;

    /// <summary>Slots made.</summary>
    public int SlotsMade => slots.Made;

    /// <summary>Runs all frames.</summary>
    /// <param name="process">The worker's part.</param>
    /// <param name="written">Called for each frame in order after it has been written.</param>
    /// <param name="cancellation">Stops the run; nothing else does but a fault.</param>
    /// <exception cref="OperationCanceledException">The token was cancelled.</exception>
    public void Run(Action<FrameSlot> process, Action<FrameSlot> written, CancellationToken cancellation)
    {
        using CancellationTokenSource stop = CancellationTokenSource.CreateLinkedTokenSource(cancellation);
        ExecutionDataflowBlockOptions options = new()
        {
            BoundedCapacity = framesInFlight,
            MaxDegreeOfParallelism = workers,
            EnsureOrdered = true,
            CancellationToken = stop.Token,
        };
        int framesWritten = 0;
        TransformBlock<FrameSlot, FrameSlot> work = new(
            slot =>
            {
                Guard(slot, () => process(slot), stop);
                return slot;
            },
            options);
        ActionBlock<FrameSlot> sink = new(
            slot =>
            {
                Guard(
                    slot,
                    () =>
                    {
                        if (slot.Frame != framesWritten)
                            throw new InvalidOperationException($"frame {slot.Frame} came where {framesWritten} was due");
                        writer.Write(slot.Frame, slot.Encoded);
                        written(slot);
                        framesWritten++;
                    },
                    stop);
                slots.Return(slot);
            },
            new ExecutionDataflowBlockOptions { BoundedCapacity = framesInFlight, MaxDegreeOfParallelism = 1, CancellationToken = stop.Token });
        work.LinkTo(sink, new DataflowLinkOptions { PropagateCompletion = true });

        Task source = Task.Run(() => ReadAll(work, stop), CancellationToken.None);
        try
        {
            Task.WhenAll(source, work.Completion, sink.Completion).GetAwaiter().GetResult();
        }
        catch (OperationCanceledException)
        {
            // Either the first fault stopped the others, and is rethrown below, or the run was cancelled.
        }

        firstFault?.Throw();
        cancellation.ThrowIfCancellationRequested();
        if (framesWritten != reader.FrameCount)
            throw new InvalidOperationException($"{reader.FrameCount} frames went in and {framesWritten} came out");
    }

    private async Task ReadAll(TransformBlock<FrameSlot, FrameSlot> work, CancellationTokenSource stop)
    {
        for (int frame = 0; frame < reader.FrameCount; frame++)
        {
            FrameSlot slot = await slots.LendAsync(stop.Token).ConfigureAwait(false);
            slot.Frame = frame;
            Guard(slot, () => reader.Read(slot.Frame, slot.Raw), stop);
            await work.SendAsync(slot, stop.Token).ConfigureAwait(false);
        }

        work.Complete();
    }

    /// <summary>
    /// Runs a part of the work. A block would swallow an OperationCanceledException together with its frame, so the
    /// first fault, of whatever type, is kept here and stops the run.
    /// </summary>
    private void Guard(FrameSlot slot, Action part, CancellationTokenSource stop)
    {
        try
        {
            stop.Token.ThrowIfCancellationRequested();
            part();
        }
        catch (Exception fault)
        {
            if (!stop.IsCancellationRequested)
            {
                Exception kept = fault is OperationCanceledException ? StoppedUnasked(slot.Frame, fault) : fault;
                Interlocked.CompareExchange(ref firstFault, ExceptionDispatchInfo.Capture(kept), null);
            }

            stop.Cancel();
            throw new OperationCanceledException(stop.Token);
        }
    }

    private PluginException StoppedUnasked(int frame, Exception fault) => new(
        $"{reader.Path}, frame {frame}", "a plugin stopped without being asked to", "report it to the author of the plugin; --verbose shows where", fault);

    public void Dispose() => slots.Dispose();
}
