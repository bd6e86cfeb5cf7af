using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>The estimates with their standard errors side by side, and the intervals to go with them.</summary>
internal static class TermsSection
{
    public static void AddTo(Letter letter, AnalysisResult result)
    {
        letter.Heading(HasClustered(result) ? "Estimates, and their standard errors side by side" : "Estimates");
        StandardErrors(letter, result);
        if (!HasClustered(result))
        {
            EstimateReport.Say(letter, result, FindingTopic.Precision, gapFirst: true);
            return;
        }

        letter.Gap();
        letter.Paragraph(
            IsCrossSection(result)
                ? "The last column is the clustered standard error over the pooled one."
                : "The last column is the clustered standard error over the pooled one: above 1, it says by how much pooling, which takes every occasion "
                + "for independent evidence, makes the standard error too small.");
        EstimateReport.Say(letter, result, FindingTopic.Precision, gapFirst: true);
        letter.Heading($"Intervals ({PlainNumber.PercentInWords(result.Settings.Confidence)}) and tests");
        Intervals(letter, result);
        BootstrapSection.AddTo(letter, result);
    }

    private static void StandardErrors(Letter letter, AnalysisResult result)
    {
        var hasBootstrap = result.Parameters.Any(p => p.StandardErrors.Bootstrap is not null);
        var hasJackknife = result.Parameters.Any(p => p.StandardErrors.Jackknife is not null);
        var jackknife = result.Jackknife?.Kind == "one_step" ? "one-step jackknife" : "jackknife";
        List<(TableColumnPlan Plan, Func<ParameterResult, int, string> Cell)> columns =
        [
            (new TableColumnPlan("term", IsNumber: false), (p, _) => Label(p)),
            (new TableColumnPlan("estimate"), (p, d) => p.Estimate is { } e ? PlainNumber.Text(e, d) : "none"),
        ];
        if (result.Parameters.Any(p => p.StandardErrors.Pooled is not null)) columns.Add((new TableColumnPlan("pooled"), (p, d) => Error(p, p.StandardErrors.Pooled, d)));
        if (IsCrossSection(result)) columns.Add((new TableColumnPlan("robust"), (p, d) => Error(p, p.StandardErrors.Robust, d)));
        if (HasClustered(result)) columns.Add((new TableColumnPlan("clustered"), (p, d) => Error(p, p.StandardErrors.Cluster, d)));
        if (hasJackknife) columns.Add((new TableColumnPlan(jackknife), (p, d) => Error(p, p.StandardErrors.Jackknife, d)));
        if (hasBootstrap) columns.Add((new TableColumnPlan("bootstrap"), (p, d) => Error(p, p.StandardErrors.Bootstrap, d)));
        if (HasClustered(result)) columns.Add((new TableColumnPlan("ratio"), (p, _) => p.SeRatio is { } r ? PlainNumber.Ratio(r) : ""));
        letter.Table(
            [.. columns.Select(c => c.Plan)],
            result.Parameters.Select(p => (IReadOnlyList<string>)[.. columns.Select(c => c.Cell(p, DecimalsOf(p)))]));
    }

    private static void Intervals(Letter letter, AnalysisResult result)
    {
        // Where the jackknife is the one to report, its intervals stand beside the clustered ones.
        var few = result.Findings.Any(f => f.Id == "advice.jackknife");
        List<(TableColumnPlan Plan, Func<ParameterResult, string> Cell)> columns =
        [
            (new TableColumnPlan("term", IsNumber: false), Label),
        ];
        if (IsCrossSection(result))
        {
            columns.Add((new TableColumnPlan("robust interval"), p => Range(p, p.Intervals.Robust)));
            columns.Add((new TableColumnPlan("p"), p => p.PValues.Robust is { } v ? PlainNumber.PValue(v) : ""));
        }
        else
        {
            columns.Add((new TableColumnPlan("clustered interval"), p => Range(p, p.Intervals.Cluster)));
            columns.Add((new TableColumnPlan("p"), p => p.PValues.Cluster is { } v ? PlainNumber.PValue(v) : ""));
        }

        if (few)
        {
            columns.Add((new TableColumnPlan("jackknife interval"), p => Range(p, p.Intervals.Jackknife)));
            columns.Add((new TableColumnPlan("p"), p => p.PValues.Jackknife is { } v ? PlainNumber.PValue(v) : ""));
        }
        else if (!IsCrossSection(result))
            columns.Add((new TableColumnPlan("worth"), p => p.EquivalentOccasions is { } n ? PlainNumber.Count(n) : ""));

        letter.Table([.. columns.Select(c => c.Plan)], result.Parameters.Select(p => (IReadOnlyList<string>)[.. columns.Select(c => c.Cell(p))]));
        letter.Gap();
        letter.Paragraph(
            "p is two-sided, against 0 for a term"
            + (result.Parameters.Any(p => p.Kind == ParameterResult.Dissimilarity) ? " and against its upper limit for a nest." : ".")
            + (few || IsCrossSection(result)
                ? ""
                : $" Worth: as many independent occasions, instead of {PlainNumber.Count(result.Sample.Occasions)} tied ones, would give the same precision."));
    }

    private static bool HasClustered(AnalysisResult result) => result.Parameters.Any(p => p.StandardErrors.Cluster is not null);

    private static bool IsCrossSection(AnalysisResult result) => result.Clusters.Largest == 1;

    public static string Label(ParameterResult p) => p.Kind == ParameterResult.Dissimilarity ? $"{p.Name} (nest)" : p.Label;

    public static int DecimalsOf(ParameterResult p) =>
        PlainNumber.Decimals(p.Estimate ?? 0, p.StandardErrors.Cluster ?? p.StandardErrors.Jackknife ?? p.StandardErrors.Pooled);

    private static string Error(ParameterResult p, double? error, int decimals) =>
        error is { } se ? PlainNumber.Text(se, decimals) : p.IsFree ? "none" : p.SameAs is null ? "fixed" : "";

    public static string Range(ParameterResult p, Interval? interval)
    {
        if (interval is null) return p.IsFree ? "none" : "fixed";
        var decimals = DecimalsOf(p);
        return $"{PlainNumber.Text(interval.Low, decimals)} to {PlainNumber.Text(interval.High, decimals)}";
    }
}
