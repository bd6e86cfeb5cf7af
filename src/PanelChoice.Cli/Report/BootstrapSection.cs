using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>What the replicates say, each figure with its Monte-Carlo error beside it.</summary>
internal static class BootstrapSection
{
    public static void AddTo(Letter letter, AnalysisResult result)
    {
        var shown = result.Parameters.Where(p => p.StandardErrors.Bootstrap is not null).ToList();
        if (shown.Count == 0) return;
        letter.Heading($"Bootstrap ({PlainNumber.PercentInWords(result.Settings.Confidence)})");
        letter.Paragraph(Words(result));
        letter.Gap();
        Table(
            letter, shown, [("se", p => p.StandardErrors.Bootstrap, p => p.BootstrapErrors.StandardError)],
            shown.Any(p => p.Intervals.BootstrapPercentile is not null) ? [("percentile", p => p.Intervals.BootstrapPercentile, p => p.BootstrapErrors.Percentile)] : []);
        List<(string, Func<ParameterResult, Interval?>, Func<ParameterResult, Interval?>)> finer = [];
        if (shown.Any(p => p.Intervals.BootstrapAccelerated is not null))
            finer.Add(("accelerated", p => p.Intervals.BootstrapAccelerated, p => p.BootstrapErrors.Accelerated));
        if (shown.Any(p => p.Intervals.BootstrapStudentised is not null))
            finer.Add(("bootstrap-t", p => p.Intervals.BootstrapStudentised, p => p.BootstrapErrors.Studentised));
        if (finer.Count > 0)
        {
            letter.Gap();
            Table(letter, shown, [], finer);
        }

        letter.Gap();
        letter.Paragraph(
            "+- is the Monte-Carlo error: how far another seed would typically move the figure before it (of an interval, its less certain end)."
            + (finer.Count > 0 ? " Accelerated: corrected for bias and skewness (Efron 1987). Bootstrap-t: each replicate over its own clustered standard error." : ""));
        if (result.Bootstrap is { Failures.IsEmpty: false, ErrorsWithFailures: { } with })
        {
            letter.Gap();
            var most = result.Parameters.Select((p, i) => with[i] / p.StandardErrors.Bootstrap).Max() ?? 1;
            letter.Paragraph(
                $"{PlainNumber.Count(result.Bootstrap.Failures.Length)} of {PlainNumber.Count(result.Bootstrap.Requested)} replicates failed; result.json lists which, and why. With them in, "
                + $"at where their searches ended, standard errors are up to {PlainNumber.Ratio(most)} times as large; percentiles count them at both extremes.");
        }
    }

    private static string Words(AnalysisResult result)
    {
        var by = result.Clusters.By == "person" ? "persons" : $"groups of '{result.Clusters.By}'";
        var length = result.Bootstrap.IsLengthAutomatic == true ? $"{result.Bootstrap.BlockLength} (found from the data)" : $"{result.Bootstrap.BlockLength}";
        var what = result.Bootstrap.Scheme switch
        {
            "clusters_exponential" => $"replicates weigh the {by} by exponential weights, so that none is ever lost; their covariance is corrected by (G + 1)/(G - 1)",
            "moving" => $"replicates draw blocks of consecutive occasions inside each person, of length {length}",
            "calendar" => $"replicates draw blocks of consecutive days for all persons together, of length {length}",
            _ => $"replicates draw whole {by} with replacement",
        };
        var found = result.Bootstrap.Target is { } target
            ? $" Their number was found so that standard errors are within {PlainNumber.PercentInWords(target)} of those of infinitely many, with probability "
            + $"{PlainNumber.PercentInWords(result.Bootstrap.TargetCoverage ?? 0)} (Andrews and Buchinsky 2000)."
            : "";
        return $"{PlainNumber.Count(result.Bootstrap.Requested)} {what}.{found}";
    }

    private static void Table(
        Letter letter, IEnumerable<ParameterResult> shown,
        IReadOnlyList<(string Name, Func<ParameterResult, double?> Value, Func<ParameterResult, double?> Error)> numbers,
        IReadOnlyList<(string Name, Func<ParameterResult, Interval?> Value, Func<ParameterResult, Interval?> Error)> intervals)
    {
        List<TableColumnPlan> columns = [new TableColumnPlan("term", IsNumber: false)];
        foreach (var name in numbers.Select(n => n.Name).Concat(intervals.Select(i => i.Name))) columns.AddRange([new TableColumnPlan(name), new TableColumnPlan("+-")]);
        letter.Table(columns, shown.Select(p =>
        {
            List<string> row = [TermsSection.Label(p)];
            var decimals = TermsSection.DecimalsOf(p);
            foreach (var (_, value, error) in numbers) row.AddRange([Text(value(p), decimals), Text(error(p), decimals + 1)]);
            foreach (var (_, value, error) in intervals)
                row.AddRange([TermsSection.Range(p, value(p)), error(p) is { } e ? Text(Math.Max(e.Low, e.High), decimals + 1) : ""]);
            return (IReadOnlyList<string>)row;
        }));

        static string Text(double? value, int decimals) => value is { } v ? PlainNumber.Text(v, decimals) : "";
    }
}
