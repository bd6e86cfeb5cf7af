using System.Globalization;
using System.Runtime.InteropServices;
using PanelChoice.Cli;

CultureInfo.DefaultThreadCurrentCulture = CultureInfo.CurrentCulture = CultureInfo.InvariantCulture;
using var interrupt = new CancellationTokenSource();

// The first interrupt asks the run to stop between two units of work; a second one is left to the system, which ends the process at once.
void Stop(PosixSignalContext signal)
{
    signal.Cancel = !interrupt.IsCancellationRequested;
    interrupt.Cancel();
}

using var onInterrupt = PosixSignalRegistration.Create(PosixSignal.SIGINT, Stop);
using var onTermination = PosixSignalRegistration.Create(PosixSignal.SIGTERM, Stop);
return CommandLine.Run(args, Terminal.OfProcess(), interrupt.Token);
