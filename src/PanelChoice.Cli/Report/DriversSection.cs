using PanelChoice.Findings;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>How many clusters each term rests on, and which moves it most.</summary>
internal static class DriversSection
{
    public static void AddTo(Letter letter, AnalysisResult result)
    {
        var terms = result.Parameters.Where(p => p.EffectiveClusters is not null).ToList();
        if (terms.Count == 0 || result.Clusters.Count < 2) return;
        letter.Heading("Who drives the result");
        List<(TableColumnPlan Plan, Func<ParameterResult, string> Cell)> columns =
        [
            (new TableColumnPlan("term", IsNumber: false), p => p.Kind == ParameterResult.Dissimilarity ? $"{p.Name} (nest)" : p.Label),
            (new TableColumnPlan("rests on"), p => p.EffectiveClusters is { } n ? PlainNumber.Count(n) : ""),
            (new TableColumnPlan("largest"), p => p.PartialLeverage?.Largest is { } share ? PlainNumber.Percent(share) : ""),
        ];
        if (terms.Exists(p => p.Influence is not null))
        {
            columns.Add((new TableColumnPlan("moved by"), p => p.Influence is { } i && p.StandardErrors.Cluster is { } se && se > 0 ? PlainNumber.Ratio(i.Largest / se) : ""));
            columns.Add((new TableColumnPlan("without", IsNumber: false), p => p.Influence?.Person ?? ""));
        }

        if (terms.Exists(p => p.StandardErrors.BiasReduced is not null))
        {
            columns.Add((new TableColumnPlan("bias-reduced"), p => p.StandardErrors.BiasReduced is { } se
                ? PlainNumber.Rounded(se, se) : ""));
            columns.Add((new TableColumnPlan("df"), p => p.Degrees.BiasReduced is { } df ? df.ToString("F1", System.Globalization.CultureInfo.InvariantCulture) : ""));
        }

        letter.Table([.. columns.Select(c => c.Plan)], terms.Select(p => (IReadOnlyList<string>)[.. columns.Select(c => c.Cell(p))]));
        letter.Gap();
        letter.Paragraph(
            $"Rests on: effective number of the {PlainNumber.Count(result.Clusters.Count)} clusters; largest: the greatest share of one. Moved by: clustered standard "
            + $"errors, without the one cluster that moves the term most{(result.Clusters.InfluenceFrom == "one_step" ? " (one Newton step, no refit)" : "")}. Bias-reduced: "
            + "clustered standard error allowing for such shares, and the degrees of freedom to read it with; for a model that is not linear it is an extension.");
    }
}
