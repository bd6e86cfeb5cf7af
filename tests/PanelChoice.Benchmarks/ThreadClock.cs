using System.Diagnostics;
using System.Runtime.InteropServices;

namespace PanelChoice.Benchmarks;

/// <summary>
/// Processor time of the calling thread: on a machine that does other work besides, it is steadier than the wall clock. Where the system
/// has no such clock the wall clock stands in.
/// </summary>
internal static partial class ThreadClock
{
    private const int ThreadProcessorTime = 3;

    /// <summary>What the clock measures.</summary>
    public static string Name => OperatingSystem.IsLinux() ? "processor time of the thread" : "wall time";

    /// <summary>Seconds since some moment.</summary>
    public static double Seconds()
    {
        if (OperatingSystem.IsLinux() && ReadClock(ThreadProcessorTime, out var time) == 0) return time.Seconds + (time.Nanoseconds * 1e-9);
        return Stopwatch.GetTimestamp() / (double)Stopwatch.Frequency;
    }

    [LibraryImport("libc", EntryPoint = "clock_gettime")]
    private static partial int ReadClock(int clock, out TimeSpec time);

    [StructLayout(LayoutKind.Sequential)]
    private struct TimeSpec
    {
        public long Seconds;
        public long Nanoseconds;
    }
}
