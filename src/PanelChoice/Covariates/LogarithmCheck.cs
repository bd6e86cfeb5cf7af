using System.Globalization;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Lists the cells whose logarithm a term needs and which do not have one.</summary>
internal static class LogarithmCheck
{
    private const int Shown = 20;

    /// <summary>Looks at every recorded occasion's offered rows of the alternatives that the term enters.</summary>
    public static IEnumerable<Problem> Problems(ChoicePanel panel, IEnumerable<PlannedTerm> terms)
    {
        foreach (var column in terms.Where(t => t.Specification.Log).GroupBy(t => ((ColumnSource)t.Specification.Source).Column, StringComparer.Ordinal))
        {
            var applies = column.SelectMany(t => t.Applies).ToHashSet();
            var name = column.First().Specification.Name;
            var values = panel.Table.Numbers[column.Key];
            var wrong = new List<int>();
            for (var o = 0; o < panel.Occasions; o++)
                foreach (var j in applies)
                {
                    var cell = (o * panel.Alternatives.Length) + j;
                    if (panel.Offered[cell] && panel.Row[cell] is var row && row >= 0 && values[row] <= 0) wrong.Add(row);
                }

            wrong.Sort();
            foreach (var row in wrong.Take(Shown))
                yield return At(panel, column.Key, $"term '{name}' takes a logarithm, which only a positive value has") with
                {
                    Row = panel.Table.SourceRow[row],
                    Value = values[row].ToString("R", CultureInfo.InvariantCulture),
                };
            if (wrong.Count > Shown)
                yield return At(panel, column.Key, string.Create(
                    CultureInfo.InvariantCulture, $"{wrong.Count} offered values in all have no logarithm; the first {Shown} are listed"));
        }
    }

    private static Problem At(ChoicePanel panel, string column, string what) =>
        new("term.log_not_positive", panel.Table.File, what, "correct the value, mark the row as not offered, or take transform = \"log\" away") { Column = column };
}
