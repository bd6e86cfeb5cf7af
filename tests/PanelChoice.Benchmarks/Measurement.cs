using System.Diagnostics;

namespace PanelChoice.Benchmarks;

/// <summary>Minimum, median and maximum of repetitions.</summary>
internal readonly record struct Spread(double Minimum, double Median, double Maximum)
{
    public static Spread Of(IEnumerable<double> values)
    {
        var sorted = values.Order().ToArray();
        return new Spread(sorted[0], (sorted[(sorted.Length - 1) / 2] + sorted[sorted.Length / 2]) / 2, sorted[^1]);
    }
}

/// <summary>Times actions side by side: in each repetition every action runs once, so that all see the same machine.</summary>
internal static class Measurement
{
    private const double ShortestSeconds = 0.02;
    private const double LongestWarmUp = 0.5;

    /// <summary>Seconds of processor time of the calling thread for each action, repetition by repetition.</summary>
    /// <param name="repetitions">Repetitions.</param>
    /// <param name="actions">The actions; a short one is repeated until it can be timed, and the time is divided.</param>
    public static double[][] OfThread(int repetitions, params Action[] actions) => SideBySide(repetitions, ThreadClock.Seconds, actions);

    /// <summary>Seconds of wall time for each action, repetition by repetition.</summary>
    /// <inheritdoc cref="OfThread"/>
    public static double[][] OfWall(int repetitions, params Action[] actions) => SideBySide(repetitions, Wall, actions);

    /// <summary>Wall time in seconds since some moment.</summary>
    public static double Wall() => Stopwatch.GetTimestamp() / (double)Stopwatch.Frequency;

    private static double[][] SideBySide(int repetitions, Func<double> clock, Action[] actions)
    {
        var times = actions.Select(_ => new double[repetitions]).ToArray();
        var calls = actions.Select(a => WarmUp(a, clock)).ToArray();
        for (var r = 0; r < repetitions; r++)
            for (var a = 0; a < actions.Length; a++)
            {
                var from = clock();
                for (var c = 0; c < calls[a]; c++) actions[a]();
                times[a][r] = (clock() - from) / calls[a];
            }

        return times;
    }

    /// <summary>Runs an action until the runtime has compiled it in full, and says how many calls make a measurable time.</summary>
    private static int WarmUp(Action action, Func<double> clock)
    {
        var last = 0.0;
        for (var round = 0; round < 4 && last < 2 * LongestWarmUp; round++)
        {
            var from = clock();
            var calls = 0;
            while (calls < 30 && clock() - from < LongestWarmUp)
            {
                action();
                calls++;
            }

            last = (clock() - from) / calls;
            Thread.Sleep(150);
        }

        return Math.Max(1, (int)Math.Ceiling(ShortestSeconds / last));
    }
}
