using PanelChoice.Findings;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>Standard errors clustered two ways, where the study asks for them.</summary>
internal static class TwoWaySection
{
    public static void AddTo(Letter letter, AnalysisResult result)
    {
        if (result.TwoWay is not { } ways) return;
        var free = result.Parameters.Where(p => p.IsFree).ToList();
        letter.Heading($"Clustered two ways: by {result.Clusters.By} and by {ways.Second}");
        letter.Table(
            [
                new TableColumnPlan("term", IsNumber: false), new TableColumnPlan("clustered"), new TableColumnPlan("two ways"),
                new TableColumnPlan($"interval ({PlainNumber.PercentInWords(result.Settings.Confidence)})"), new TableColumnPlan("p"),
            ],
            free.Select(p => (IReadOnlyList<string>)
            [
                p.Kind == ParameterResult.Dissimilarity ? $"{p.Name} (nest)" : p.Label, Error(p, p.StandardErrors.Cluster), Error(p, p.StandardErrors.TwoWay), Range(p),
                p.PValues.TwoWay is { } v ? PlainNumber.PValue(v) : "",
            ]));
        letter.Gap();
        letter.Paragraph(
            $"Two ways also holds what ties different {(result.Clusters.By == "person" ? "persons" : "clusters")} in the same {ways.Second}: {PlainNumber.Count(ways.Clusters)} by "
            + $"{result.Clusters.By}, {PlainNumber.Count(ways.SecondClusters)} by {ways.Second}, read with {PlainNumber.Count(Math.Min(ways.Clusters, ways.SecondClusters) - 1)} "
            + "degrees of freedom."
            + (ways.NegativeBeforeRepair.IsEmpty ? "" : " None: the variance comes out negative, so that there is no such figure.")
            + (ways.Repaired ? " Negative eigenvalues of the matrix were set to 0 for joint tests; these figures are from before that." : ""));
    }

    private static string Error(ParameterResult p, double? error) => error is { } se ? PlainNumber.Text(se, Decimals(p)) : "none";

    private static string Range(ParameterResult p) => p.Intervals.TwoWay is { } interval
        ? $"{PlainNumber.Text(interval.Low, Decimals(p))} to {PlainNumber.Text(interval.High, Decimals(p))}"
        : "none";

    private static int Decimals(ParameterResult p) => PlainNumber.Decimals(p.Estimate ?? 0, p.StandardErrors.Cluster ?? p.StandardErrors.TwoWay);
}
