using System.CommandLine;

namespace PanelChoice.Benchmarks;

/// <summary>The command line of the benchmarks: which cases, which rows.</summary>
internal static class BenchmarkCommand
{
    /// <summary>A result was wrong: bits, a status or a figure that another computation does not confirm.</summary>
    public const int Wrong = 1;

    private const int Usage = 64;

    /// <summary>Rows that are measured case by case.</summary>
    private static readonly (string Name, Action<CaseAtWork> Measure)[] ByCase =
    [
        ("gradient", LikelihoodRows.Gradient), ("stream", LikelihoodRows.Stream), ("hessian", LikelihoodRows.Hessian), ("fit", EstimationRows.Fit),
        ("covariances", EstimationRows.Covariances), ("bootstrap", EstimationRows.Bootstrap), ("jackknife", EstimationRows.Jackknife),
        ("threads", LikelihoodRows.Threads),
    ];

    private static readonly string[] Others = ["elementary"];

    /// <summary>Parses and measures.</summary>
    public static int Run(string[] args)
    {
        var cases = Words("--case", "Cases: S, M, L; all of them when left out.", ["S", "M", "L"]);
        var rows = Words("--rows", "Rows of the table; all of them when left out.", [.. Others, .. ByCase.Select(r => r.Name)]);
        var root = new RootCommand("Measures the speed of PanelChoice as ratios of things timed side by side in one run.") { cases, rows };
        root.SetAction(r => Measure(r.GetRequiredValue(cases), r.GetRequiredValue(rows)));
        var parsed = root.Parse(args);
        if (parsed.Errors.Count == 0) return parsed.Invoke(new InvocationConfiguration { EnableDefaultExceptionHandler = false });
        foreach (var error in parsed.Errors) Console.Error.WriteLine(error.Message);
        return Usage;
    }

    private static Option<string[]> Words(string name, string description, string[] all)
    {
        var option = new Option<string[]>(name)
        {
            Description = $"{description} Several are divided by commas: {string.Join(",", all)}",
            DefaultValueFactory = _ => all,
            CustomParser = result =>
            {
                var words = result.Tokens.SelectMany(t => t.Value.Split(',')).ToArray();
                foreach (var word in words.Except(all)) result.AddError($"{name} knows {string.Join(", ", all)}, not '{word}'.");
                return words;
            },
        };
        return option;
    }

    private static int Measure(string[] cases, string[] rows)
    {
        Console.WriteLine($"Kernel {KernelName()}; {Environment.ProcessorCount} processors; {ThreadClock.Name} unless a row says otherwise");
        RatioTable.Heading();
        if (rows.Contains("elementary")) ElementaryRows.Run();
        foreach (var name in cases)
            foreach (var isRounded in new[] { true, false })
            {
                var wanted = ByCase.Where(r => rows.Contains(r.Name) && Belongs(r.Name, name, isRounded)).ToArray();
                if (wanted.Length == 0) continue;
                var work = new CaseAtWork(CommuteCase.Make(CommuteShape.Of(name), isRounded));
                foreach (var row in wanted) row.Measure(work);
            }

        return Agreement.IsBroken ? Wrong : 0;
    }

    /// <summary>Which rows a case is measured for: the replicates only where a goal is set, threads where there is enough for two.</summary>
    private static bool Belongs(string row, string name, bool isRounded) => row switch
    {
        "bootstrap" => name is "S" or "M",
        "jackknife" => name == "S" && isRounded,
        "threads" => name != "S",
        _ => true,
    };

    private static string KernelName() => new CaseAtWork(CommuteCase.Make(CommuteShape.Small, isRounded: true)).Likelihood.Kernel;
}
