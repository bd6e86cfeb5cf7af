using System.Diagnostics;

namespace PanelChoice.Results.Refits;

/// <summary>
/// Decides when what was written goes from the system to the disk. A process that is killed loses nothing that the system has; a machine that fails loses
/// what is not on its disk. Waiting for the disk behind every batch can take longer than the batch, so that it is waited for at most once a second and
/// for at most a twentieth of the time. Only how much is lost with a machine depends on this clock, no figure.
/// </summary>
/// <param name="flush">Flushes to the disk.</param>
/// <param name="clock">Ticks that pass, in <see cref="TimeSpan"/>'s units.</param>
internal sealed class DiskSync(Action flush, Func<TimeSpan> clock)
{
    /// <summary>Least time between two flushes.</summary>
    public static readonly TimeSpan Least = TimeSpan.FromSeconds(1);

    /// <summary>Time between two flushes as a multiple of what the last one took.</summary>
    public const int LeastMultiple = 19;

    private TimeSpan next = clock() + Least;

    /// <summary>Of a file, by the machine's clock.</summary>
    public static DiskSync Of(FileStream file)
    {
        var begin = Stopwatch.GetTimestamp();
        return new DiskSync(() => file.Flush(flushToDisk: true), () => Stopwatch.GetElapsedTime(begin));
    }

    /// <summary>Something was written: flushes it where it is time to.</summary>
    public void Written()
    {
        var begin = clock();
        if (begin < next) return;
        flush();
        var end = clock();
        var pause = LeastMultiple * (end - begin);
        next = end + (pause > Least ? pause : Least);
    }
}
