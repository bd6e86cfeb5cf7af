using System.CommandLine;
using PanelChoice.Design;
using PanelChoice.Likelihood;

namespace PanelChoice.Benchmarks;

/// <summary>The command line of the benchmarks: which cases, which rows.</summary>
internal static class BenchmarkCommand
{
    /// <summary>A result was wrong: bits, a status or a figure that another computation does not confirm.</summary>
    public const int Wrong = 1;

    private const int Usage = 64;

    private static readonly string[] Cases = ["S", "M", "L"];

    /// <summary>Rows that are measured case by case.</summary>
    private static readonly (string Name, Action<CaseAtWork> Measure)[] ByCase =
    [
        ("gradient", LikelihoodRows.Gradient), ("stream", LikelihoodRows.Stream), ("hessian", LikelihoodRows.Hessian), ("fit", EstimationRows.Fit),
        ("covariances", EstimationRows.Covariances), ("bootstrap", EstimationRows.Bootstrap), ("jackknife", EstimationRows.Jackknife),
        ("diagnostics", DiagnosticsRows.Battery), ("threads", LikelihoodRows.Threads),
    ];

    /// <summary>Rows that are measured once.</summary>
    private static readonly (string Name, Action<string[]> Measure)[] Others =
    [
        ("whole", cases => WholeRunRows.Run(OneOf(cases))), ("loading", cases => LoadingRows.Run(OneOf(cases))), ("growth", _ => GrowthRows.Run()),
        ("narrow", NarrowRows.Run), ("store", cases => StoreRows.Run(CommuteShape.Of(cases[^1]))), ("parts", cases => PartRows.Run(OneOf(cases))),
        ("journal", _ => JournalRows.Run()),
    ];

    private static readonly string[] Rows = ["elementary", .. ByCase.Select(r => r.Name), .. Others.Select(r => r.Name)];

    /// <summary>Parses and measures.</summary>
    public static int Run(string[] args)
    {
        var cases = Words("--case", "Cases; all when left out", Cases);
        var rows = Words("--rows", "Rows of the table; all when left out", Rows);
        var root = new RootCommand("Measures the speed of PanelChoice as ratios of things timed side by side in one run.") { cases, rows };
        root.SetAction(r => Measure(r.GetRequiredValue(cases), r.GetRequiredValue(rows)));
        root.Add(InProcessOfItsOwn<string>("load", "a study file", LoadingRows.Load));
        root.Add(InProcessOfItsOwn<int>("size", "situations", GrowthRows.Size));
        var parsed = root.Parse(args);
        if (parsed.Errors.Count == 0) return parsed.Invoke(new InvocationConfiguration { EnableDefaultExceptionHandler = false });
        foreach (var error in parsed.Errors) Console.Error.WriteLine(error.Message);
        return Usage;
    }

    private static Option<string[]> Words(string name, string description, string[] all) => new(name)
    {
        Description = $"{description}. Several are divided by commas: {string.Join(",", all)}",
        DefaultValueFactory = _ => all,
        CustomParser = result =>
        {
            var words = result.Tokens.SelectMany(t => t.Value.Split(',')).ToArray();
            foreach (var word in words.Except(all)) result.AddError($"{name} knows {string.Join(", ", all)}, not '{word}'.");
            return words;
        },
    };

    /// <summary>A measurement that the program starts itself in for, because time and memory must be its alone.</summary>
    private static Command InProcessOfItsOwn<T>(string name, string of, Action<T> measure)
    {
        var argument = new Argument<T>("of") { Description = of };
        var command = new Command(name) { argument };
        command.Hidden = true;
        command.SetAction(r =>
        {
            measure(r.GetRequiredValue(argument));
            return 0;
        });
        return command;
    }

    private static int Measure(string[] cases, string[] rows)
    {
        Console.WriteLine($"Kernel {KernelName()}; {Environment.ProcessorCount} processors; {ThreadClock.Name} unless a row says otherwise; times are minima");
        RatioTable.Heading();
        if (rows.Contains("elementary")) ElementaryRows.Run();
        foreach (var name in cases)
            foreach (var isRounded in new[] { true, false })
            {
                var wanted = ByCase.Where(r => rows.Contains(r.Name) && Belongs(r.Name, name, isRounded)).ToArray();
                if (wanted.Length == 0) continue;
                var work = new CaseAtWork(CommuteCase.Make(CommuteShape.Of(name), isRounded));
                Tell(work);
                foreach (var row in wanted) row.Measure(work);
            }

        foreach (var (name, measure) in Others)
            if (rows.Contains(name)) measure(cases);
        return Agreement.IsBroken ? Wrong : 0;
    }

    /// <summary>Which rows a case is measured for: the jackknife only where a goal is set, threads where there is enough for two.</summary>
    private static bool Belongs(string row, string name, bool isRounded) => row switch
    {
        "jackknife" => name == "S" && isRounded,
        "threads" => name == "M",
        _ => true,
    };

    /// <summary>The case of rows that are measured for one: M, unless it was not asked for.</summary>
    private static CommuteShape OneOf(string[] cases) => CommuteShape.Of(cases.Contains("M") ? "M" : cases[^1]);

    private static void Tell(CaseAtWork work)
    {
        var shape = work.Made.Shape;
        var codings = work.Design.Store.Format.Columns.GroupBy(c => c.Coding).OrderBy(g => g.Key);
        RatioTable.Remark(
            $"{work.Label}: {shape.Persons:#,0} persons x {shape.Occasions} occasions, {shape.Alternatives} alternatives, {work.Design.Layout.Count} parameters; "
            + $"{work.Design.Store.Bytes / 1e6:#,0.0} MB in columns of {string.Join(", ", codings.Select(g => $"{Word(g.Key)} ({g.Count()})"))}");
    }

    private static string Word(ColumnCoding coding) => coding switch
    {
        ColumnCoding.Whole16 => "16-bit integers",
        ColumnCoding.Whole32 => "32-bit integers",
        _ => "doubles",
    };

    private static string KernelName() => new VectorNestedLogit(CommuteCase.Make(CommuteShape.Small, isRounded: true).Design(), CommuteCase.Form, 1).Kernel;
}
