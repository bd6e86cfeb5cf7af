using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>Tests of terms: their p-values side by side.</summary>
internal static class TestsSection
{
    private static readonly (CovarianceKind Kind, string Word)[] Kinds =
    [
        (CovarianceKind.Robust, "robust"), (CovarianceKind.Cluster, "clustered"), (CovarianceKind.TwoWay, "two-way"),
        (CovarianceKind.Jackknife, "jackknife"),
    ];

    public static void AddTo(Letter letter, AnalysisResult result)
    {
        if (result.Tests.IsEmpty) return;
        letter.Heading("Tests of terms");
        var isCrossSection = result.Clusters.Largest == 1;
        List<(TableColumnPlan Plan, Func<TermTestResult, string> Cell)> columns =
        [
            (new TableColumnPlan("test", IsNumber: false), t => t.Test.Name),
            (new TableColumnPlan("df"), t => PlainNumber.Count(t.LikelihoodRatio.Freedom)),
        ];
        foreach (var (kind, word) in Kinds)
            // Single choices are robust where each person has one; clusters say more everywhere else.
            if (kind != CovarianceKind.Robust == !isCrossSection && result.Tests.Any(t => t.Wald.GetValueOrDefault(kind)?.PValue is not null))
                columns.Add((new TableColumnPlan(word), t => P(t.Wald.GetValueOrDefault(kind)?.PValue)));
        if (result.Tests.Any(t => t.ScoreBootstrap?.PValue is not null)) columns.Add((new TableColumnPlan("score"), t => P(t.ScoreBootstrap?.PValue)));
        if (result.Tests.Any(t => t.LikelihoodRatio.PValue is not null)) columns.Add((new TableColumnPlan("ratio"), t => P(t.LikelihoodRatio.PValue)));
        letter.Table([.. columns.Select(c => c.Plan)], result.Tests.Select(t => (IReadOnlyList<string>)[.. columns.Select(c => c.Cell(t))]));
        letter.Gap();
        letter.Paragraph(
            "Figures are p-values: of Wald tests with each covariance"
            + (result.Tests.Any(t => t.ScoreBootstrap?.PValue is not null)
                ? $"; score: of the score bootstrap, which estimates with the claim in force and {Draws(result)}"
                : "")
            + "; ratio: of the likelihood ratio, which takes every occasion for independent evidence and is valid only where they are.");
        Intervals(letter, result);
    }

    private static string Draws(AnalysisResult result)
    {
        var score = result.Tests.First(t => t.ScoreBootstrap?.PValue is not null).ScoreBootstrap!;
        return score.Enumerated ? $"goes through all {PlainNumber.Count(score.Draws)} sets of signs" : $"rests on {PlainNumber.Count(score.Draws)} draws";
    }

    private static void Intervals(Letter letter, AnalysisResult result)
    {
        var single = result.Tests.Where(t => t.ScoreBootstrap?.Interval is not null).ToList();
        if (single.Count == 0) return;
        letter.Gap();
        letter.Table(
            [new TableColumnPlan("term", IsNumber: false), new TableColumnPlan("score bootstrap interval")],
            single.Select(t =>
            {
                var interval = t.ScoreBootstrap!.Interval!;
                var decimals = PlainNumber.Decimals(interval.High, (interval.High - interval.Low) / 4);
                return (IReadOnlyList<string>)[t.Test.Terms[0].Label, $"{PlainNumber.Text(interval.Low, decimals)} to {PlainNumber.Text(interval.High, decimals)}"];
            }));
    }

    // Many columns: the words of other tables would leave no room for the names.
    private static string P(double? p) => p switch { null => "none", < 0.0001 => "<0.0001", { } known => PlainNumber.PValue(known) };
}
