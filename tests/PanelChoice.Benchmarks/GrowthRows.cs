using System.Globalization;

namespace PanelChoice.Benchmarks;

/// <summary>What a situation costs as panels grow, each size in a process of its own.</summary>
internal static class GrowthRows
{
    private const int Repetitions = 5;

    private static readonly int[] Sizes = [10_000, 100_000, 1_000_000, 10_000_000];

    /// <summary>Measures and prints the growth table and the row about it.</summary>
    public static void Run()
    {
        const string Line = "    {0,14}{1,16}{2,16}{3,18}{4,18}{5,14}";
        var pass = new Dictionary<int, double>();
        var table = new List<string>();
        foreach (var size in Sizes)
        {
            var child = ChildProcess.Benchmarks(new Dictionary<string, string>(), "size", size.ToString(CultureInfo.InvariantCulture));
            Agreement.Holds(child.Code == 0, $"the process with {size} situations ended with {child.Code}");
            double[] told = [.. child.Output.Split(' ').Select(t => double.Parse(t, CultureInfo.InvariantCulture))];
            pass[size] = told[0];
            table.Add(string.Format(
                CultureInfo.InvariantCulture, Line, size.ToString("#,0", CultureInfo.InvariantCulture), $"{told[0] * 1e9:F1}", $"{told[1] * 1e9:F0}", $"{told[2]:F0}",
                $"{child.PeakBytes / (double)size:#,0}", $"{told[3]:F6}"));
        }

        var ratio = pass[Sizes[^1]] / pass[Sizes[1]];
        RatioTable.Row(
            "10", "gradient pass for each situation, 1e7 situations / 1e5, best of each", "coded", $"{pass[Sizes[^1]] * 1e9:F1} ns", $"{pass[Sizes[1]] * 1e9:F1} ns",
            new Spread(ratio, ratio, ratio), Goal.AtMost(1.3));
        RatioTable.Remark("for each situation; the peak is that of a process that also draws the panel and holds its covariates as doubles");
        Console.WriteLine(Line, "situations", "pass, ns", "cold fit, ns", "store, bytes", "peak, bytes", "log P, mean");
        foreach (var line in table) Console.WriteLine(line);
    }

    /// <summary>In the process of its own: seconds for each situation of a pass and of a fit, bytes of the store, mean log P at the estimate.</summary>
    public static void Size(int situations)
    {
        var work = new CaseAtWork(CommuteCase.Make(CommuteShape.OfSituations(situations), isRounded: true));
        var pass = Measurement.OfThread(Repetitions, () => work.GradientPass())[0].Min();
        var fits = new double[2];
        for (var r = 0; r < fits.Length; r++)
        {
            var from = ThreadClock.Seconds();
            work.ColdFit();
            fits[r] = ThreadClock.Seconds() - from;
        }

        double count = work.Design.Situations;
        Console.WriteLine($"{pass / count:R} {fits.Min() / count:R} {work.Design.Store.Bytes / count:R} {work.Model.LogLikelihood / count:R}");
    }
}
