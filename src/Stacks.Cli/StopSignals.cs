using System.Runtime.InteropServices;

namespace Stacks.Cli;

/// <summary>
/// Turns SIGINT and SIGTERM into a cancelled token, so that a run ends without a file under its final name. SIGXFSZ is
/// ignored: a write beyond the file size limit then fails by EFBIG, which is reported, where it would kill the process.
/// </summary>
internal sealed class StopSignals : IDisposable
{
    private const PosixSignal FileSizeExceeded = (PosixSignal)25;
    private readonly CancellationTokenSource source = new();
    private readonly PosixSignalRegistration[] registrations;

    public StopSignals() => registrations =
    [
        PosixSignalRegistration.Create(PosixSignal.SIGINT, Stop),
        PosixSignalRegistration.Create(PosixSignal.SIGTERM, Stop),
        .. OperatingSystem.IsWindows() ? [] : new[] { PosixSignalRegistration.Create(FileSizeExceeded, context => context.Cancel = true) },
    ];

    /// <summary>Cancelled by the first signal.</summary>
    public CancellationToken Token => source.Token;

    public void Dispose()
    {
        foreach (PosixSignalRegistration registration in registrations)
            registration.Dispose();
        source.Dispose();
    }

    private void Stop(PosixSignalContext context)
    {
        context.Cancel = true; // the run ends by itself, with exit code 75
        source.Cancel();
    }
}
