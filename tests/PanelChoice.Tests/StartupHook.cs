using System.Diagnostics.Tracing;
using System.Globalization;
using System.Runtime.InteropServices;

/// <summary>
/// Makes the real program hold still at one of its own tracing events, so that a test can kill it exactly there. The runtime calls it before the program's first line where
/// <c>DOTNET_STARTUP_HOOKS</c> names this assembly; no line of the program knows of it.
/// </summary>
#pragma warning disable CA1050, CA1812 // The runtime looks for this very name outside any namespace, and makes the call itself.
internal sealed class StartupHook
#pragma warning restore CA1050, CA1812
{
    /// <summary>Variable that says where to hold: "RefitsKept 137" (as soon as so many are kept), or "FileNamed 2" (at the second event of that name).</summary>
    public const string Place = "PANELCHOICE_TEST_HOLD";

    /// <summary>Variable that names a file which is made as soon as the program holds.</summary>
    public const string Mark = "PANELCHOICE_TEST_MARK";

    private static Holder? holder;

    public static void Initialize()
    {
        if (Environment.GetEnvironmentVariable(Place)?.Split(' ') is [var name, var count])
            holder = new Holder(name, int.Parse(count, CultureInfo.InvariantCulture), Environment.GetEnvironmentVariable(Mark)!);
    }

    private sealed class Holder : EventListener
    {
        private readonly ManualResetEventSlim interrupted = new();
        private readonly PosixSignalRegistration onInterrupt;
        private readonly string name;
        private readonly int count;
        private readonly string mark;
        private int seen;

        public Holder(string name, int count, string mark)
        {
            (this.name, this.count, this.mark) = (name, count, mark);
            onInterrupt = PosixSignalRegistration.Create(PosixSignal.SIGTERM, _ => interrupted.Set());
        }

        public override void Dispose()
        {
            onInterrupt.Dispose();
            interrupted.Dispose();
            base.Dispose();
        }

        protected override void OnEventSourceCreated(EventSource eventSource)
        {
            if (eventSource.Name == "PanelChoice") EnableEvents(eventSource, EventLevel.LogAlways);
        }

        protected override void OnEventWritten(EventWrittenEventArgs eventData)
        {
            if (eventData.EventName != name) return;
            seen = name == "RefitsKept" ? (int)eventData.Payload![1]! : seen + 1;
            if (seen < count) return;
            File.WriteAllText(mark, "");
            // An interrupt lets it go on, so that the program can act on it; nothing else does.
            interrupted.Wait();
        }
    }
}
