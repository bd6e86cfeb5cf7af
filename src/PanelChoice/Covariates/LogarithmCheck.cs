using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Lists the cells whose logarithm a term needs and which do not have one, part by part.</summary>
internal sealed class LogarithmCheck
{
    private const string Id = "term.log_not_positive";

    private readonly ProblemList problems = new();

    /// <summary>Whether nothing is wrong so far.</summary>
    public bool IsEmpty => problems.IsEmpty;

    /// <summary>What is wrong, in the order of rows.</summary>
    public ImmutableArray<Problem> Problems => ProblemList.InRowOrder(problems);

    /// <summary>Looks at every recorded occasion's offered rows of the alternatives that a term enters.</summary>
    public void Add(ChoicePanel part, IEnumerable<PlannedTerm> terms)
    {
        var cells = terms.Where(t => t.Specification.Log)
            .Select(t => (t.Specification.Name, ((ColumnSource)t.Specification.Source).Column, t.Applies))
            .SelectMany(t => Rows(part, t.Column, t.Applies).Select(row => (Row: row, t.Column, t.Name)))
            .OrderBy(c => c.Row).DistinctBy(c => (c.Row, c.Column));
        foreach (var (row, column, name) in cells)
        {
            if (!problems.Count(Id)) continue;
            problems.List(new Problem(
                Id, part.Table.File, $"term '{name}' takes a logarithm, which only a positive value has",
                "correct the value, mark the row as not offered, or take transform = \"log\" away")
            {
                Row = part.Table.SourceRow[row],
                Column = column,
                Value = part.Table.Numbers[column][row].ToString("R", CultureInfo.InvariantCulture),
            });
        }
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
