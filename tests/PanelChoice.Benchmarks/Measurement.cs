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
    /// <summary>Seconds of each action, repetition by repetition.</summary>
    /// <param name="repetitions">Repetitions.</param>
    /// <param name="useThreadClock">Processor time of the calling thread; else wall time.</param>
    /// <param name="shortest">An action is repeated until it takes this many seconds, and the time is divided.</param>
    /// <param name="actions">The actions.</param>
    public static double[][] SideBySide(int repetitions, bool useThreadClock, double shortest, params Action[] actions)
    {
        Func<double> clock = useThreadClock ? ThreadClock.Seconds : () => Stopwatch.GetTimestamp() / (double)Stopwatch.Frequency;
        var times = actions.Select(_ => new double[repetitions]).ToArray();
        var calls = actions.Select(a => WarmUp(a, clock, shortest)).ToArray();
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
    private static int WarmUp(Action action, Func<double> clock, double shortest)
    {
        var last = 0.0;
        for (var round = 0; round < 4; round++)
        {
            var from = clock();
            var calls = 0;
            while (calls < 30 && clock() - from < 0.5)
            {
                action();
                calls++;
            }

            last = (clock() - from) / calls;
            Thread.Sleep(150);
        }

        return Math.Max(1, (int)Math.Ceiling(shortest / last));
    }
}
