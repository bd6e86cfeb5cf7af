using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Lists the cells whose logarithm a term needs and which do not have one.</summary>
internal static class LogarithmCheck
{
    private const string Id = "term.log_not_positive";

    /// <summary>Looks at every recorded occasion's offered rows of the alternatives that the term enters.</summary>
    public static ImmutableArray<Problem> Problems(ChoicePanel panel, IEnumerable<PlannedTerm> terms)
    {
        var problems = new ProblemList();
        var cells = terms.Where(t => t.Specification.Log)
            .Select(t => (t.Specification.Name, ((ColumnSource)t.Specification.Source).Column, t.Applies))
            .SelectMany(t => Rows(panel, t.Column, t.Applies).Select(row => (Row: row, t.Column, t.Name)))
            .OrderBy(c => c.Row).DistinctBy(c => (c.Row, c.Column));
        foreach (var (row, column, name) in cells)
        {
            if (!problems.Count(Id)) continue;
            problems.List(new Problem(
                Id, panel.Table.File, $"term '{name}' takes a logarithm, which only a positive value has",
                "correct the value, mark the row as not offered, or take transform = \"log\" away")
            {
                Row = panel.Table.SourceRow[row],
                Column = column,
                Value = panel.Table.Numbers[column][row].ToString("R", CultureInfo.InvariantCulture),
            });
        }

        return ProblemList.InRowOrder(problems);
    }

    private static IEnumerable<int> Rows(ChoicePanel panel, string column, ImmutableArray<int> applies)
    {
        var values = panel.Table.Numbers[column];
        for (var o = 0; o < panel.Occasions; o++)
            foreach (var j in applies)
            {
                var cell = (o * panel.Alternatives.Length) + j;
                if (panel.Offered[cell] && panel.Row[cell] is var row && row >= 0 && values[row] <= 0) yield return row;
            }
    }
}
