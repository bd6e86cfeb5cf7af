using PanelChoice.Diagnostics;
using PanelChoice.Findings;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>The figures behind the verdict.</summary>
internal static class IndependenceSection
{
    public static void AddTo(Letter letter, AnalysisResult result)
    {
        var diagnostics = result.Diagnostics;
        if (diagnostics.Verdict == Verdict.NotApplicable) return;
        letter.Gap();
        letter.Table(
            [new TableColumnPlan("test", IsNumber: false), new TableColumnPlan("z"), new TableColumnPlan("p")],
            Tests(diagnostics));
        if (!diagnostics.Lags.IsEmpty)
        {
            letter.Gap();
            letter.Table(
                [new TableColumnPlan($"distance in {Plural(diagnostics.StepUnit)}", IsNumber: false), new TableColumnPlan("dependence"), new TableColumnPlan("its error"), new TableColumnPlan("pairs")],
                diagnostics.Lags.Select(l => new[]
                {
                    l.Lag.ToString(System.Globalization.CultureInfo.InvariantCulture), PlainNumber.Rounded(l.Gamma, l.StandardError),
                    PlainNumber.Rounded(l.StandardError, l.StandardError), PlainNumber.Count(l.Pairs),
                }));
            letter.Gap();
            letter.Paragraph("Dependence is in units of utility: how much the surprise of the earlier occasion carries over. Its error is what chance alone would give.");
        }

        if (!diagnostics.ByAlternative.IsEmpty)
        {
            letter.Gap();
            letter.Table(
                [new TableColumnPlan("persistence in", IsNumber: false), new TableColumnPlan("z")],
                diagnostics.ByAlternative.Select(a => (a.Name, a.Z)).Concat(diagnostics.ByNest.Select(n => (n.Name + " (nest)", n.Z)))
                    .Select(x => new[] { x.Item1, PlainNumber.Ratio(x.Item2) }));
        }

        if (diagnostics.VarianceInflation is { } inflation)
        {
            letter.Gap();
            letter.Paragraph(
                $"Averaged over all terms, dependence multiplies the variance of the pooled estimate by about {PlainNumber.Ratio(inflation)}"
                + (inflation > 1 ? $", hence its standard error by {PlainNumber.Ratio(Math.Sqrt(inflation))}." : "."));
        }
    }

    private static IEnumerable<IReadOnlyList<string>> Tests(DiagnosticsResult diagnostics)
    {
        if (diagnostics.Detector is { } detector)
            yield return ["ties between one person's occasions (detector)", PlainNumber.Ratio(detector.Statistic), PlainNumber.PValue(detector.PValue)];
        if (diagnostics.DateScore is { } date)
            yield return ["ties between persons on the same day (date score)", PlainNumber.Ratio(date.Z), PlainNumber.PValue(date.PValue)];
    }

    private static string Plural(string unit) => unit + "s";
}
