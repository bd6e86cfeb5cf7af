using System.Globalization;
using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>Checks the rows of one occasion, and what must not change within a person.</summary>
internal sealed class ChoiceSetChecks(StudySpecification study, ChoiceTable table, ProblemList problems)
{
    private readonly string? second = SecondGrouping.Of(study)?.Column;

    /// <summary>Checks an occasion: each alternative at most once, exactly one chosen, and that one offered; one group of the second grouping.</summary>
    /// <param name="rows">The occasion's rows in the order of their alternatives.</param>
    public void CheckOccasion(ReadOnlySpan<int> rows)
    {
        var isTwice = false;
        for (var i = 1; i < rows.Length; i++)
            if (table.Alternative.Codes[rows[i]] == table.Alternative.Codes[rows[i - 1]])
            {
                NoteDuplicate(rows[i], rows[i - 1], isFirst: !isTwice);
                isTwice = true;
            }

        // Two occasions taken for one also show two choices; one problem is enough for them.
        if (!isTwice) CheckChoice(rows);
        if (second is not null) CheckSecondCluster(rows, second);
    }

    /// <summary>Checks that the weight is positive and, like the cluster, the same on all rows of a person.</summary>
    /// <param name="rows">The person's rows.</param>
    public void CheckPerson(ReadOnlySpan<int> rows)
    {
        if (study.Panel.Weight is { } weight) CheckWeight(rows, weight);
        if (study.Inference.Cluster != "person") CheckCluster(rows, study.Inference.Cluster);
    }

    private void NoteDuplicate(int row, int earlier, bool isFirst)
    {
        if (table.OccasionKind != OccasionKind.None)
            Note(
                "data.duplicate", row, study.Panel.Alternative, NameOf(row),
                () => $"{WhoAndWhen(row)} has this alternative already in row {RowOf(earlier)}", "keep one row for each person, occasion and alternative");
        else if (isFirst)
            Note(
                "data.several_occasions", row, study.Panel.Alternative, NameOf(row),
                () => $"{WhoAndWhen(row)} has this alternative already in row {RowOf(earlier)}, as on several occasions",
                "name the column of occasions under [panel] occasion, or keep one row for each person and alternative");
    }

    private void CheckChoice(ReadOnlySpan<int> rows)
    {
        var chosen = -1;
        foreach (var row in rows)
        {
            if (!table.Chosen[row]) continue;
            if (chosen >= 0)
            {
                var first = chosen;
                Note(
                    "data.several_chosen", row, study.Panel.Chosen, "1",
                    () => $"{WhoAndWhen(row)} chose both '{NameOf(row)}' and '{NameOf(first)}' (row {RowOf(first)})", "mark exactly one row of an occasion as chosen");
            }
            else
            {
                chosen = row;
            }

            if (!table.Offered[row])
                Note(
                    "data.chosen_not_offered", row, study.Panel.Offered, "0",
                    () => $"{WhoAndWhen(row)} chose '{NameOf(row)}', which is marked as not offered", "mark it as offered, or correct the choice");
        }

        if (chosen >= 0) return;
        var firstRow = rows[0];
        foreach (var row in rows) firstRow = Math.Min(firstRow, row);
        Note(
            "data.none_chosen", firstRow, study.Panel.Chosen, null,
            () => $"{WhoAndWhen(firstRow)} chose nothing, here or in the rows that belong to it", "mark the chosen row, or take the occasion out");
    }

    private void CheckWeight(ReadOnlySpan<int> rows, string column)
    {
        var first = -1;
        var isConstant = true;
        foreach (var row in rows)
        {
            var weight = table.Weight[row];
            if (double.IsNaN(weight)) continue;
            if (weight <= 0) Note("data.weight_not_positive", row, column, Text(weight), () => "a sampling weight must be above 0", "give the weight, or take the person out");
            if (first < 0) first = row;
            var reference = first;
            if (isConstant && weight != table.Weight[reference])
            {
                isConstant = false;
                Note(
                    "data.weight_not_constant", row, column, Text(weight),
                    () => $"person '{PersonOf(row)}' has weight {Text(table.Weight[reference])} in row {RowOf(reference)}", "give each person one weight");
            }
        }
    }

    private void CheckSecondCluster(ReadOnlySpan<int> rows, string column)
    {
        var cells = table.Texts[column];
        var first = -1;
        foreach (var row in rows)
        {
            if (cells.Codes[row] == CodedColumn.NoValue) continue;
            if (first < 0) first = row;
            var reference = first;
            if (cells.Codes[row] == cells.Codes[reference]) continue;
            Note(
                "data.second_cluster_not_constant", row, column, cells.Levels[cells.Codes[row]],
                () => $"{WhoAndWhen(row)} is in '{cells.Levels[cells.Codes[reference]]}' in row {RowOf(reference)}", "give all rows of an occasion the same value");
            return;
        }
    }

    private void CheckCluster(ReadOnlySpan<int> rows, string column)
    {
        var cluster = table.Texts[column];
        var first = -1;
        foreach (var row in rows)
        {
            if (cluster.Codes[row] == CodedColumn.NoValue) continue;
            if (first < 0) first = row;
            if (cluster.Codes[row] == cluster.Codes[first]) continue;
            var reference = first;
            Note(
                "data.cluster_not_constant", row, column, cluster.Levels[cluster.Codes[row]],
                () => $"person '{PersonOf(row)}' is in cluster '{cluster.Levels[cluster.Codes[reference]]}' in row {RowOf(reference)}",
                "cluster by a column that does not change within a person");
            return;
        }
    }

    private void Note(string id, int row, string? column, string? value, Func<string> what, string remedy)
    {
        if (problems.Count(id))
            problems.List(new Problem(id, table.File, what(), remedy) { Row = table.SourceRow[row], Column = column, Value = value });
    }

    private string WhoAndWhen(int row) =>
        table.OccasionKind == OccasionKind.None
            ? $"person '{PersonOf(row)}'"
            : $"person '{PersonOf(row)}' at occasion {OccasionName.Of(table.OccasionKind, table.Occasion[row])}";

    private string PersonOf(int row) => table.Person.Levels[table.Person.Codes[row]];

    private string NameOf(int row) => table.Alternative.Levels[table.Alternative.Codes[row]];

    private string RowOf(int row) => table.SourceRow[row].ToString(CultureInfo.InvariantCulture);

    private static string Text(double value) => value.ToString(CultureInfo.InvariantCulture);
}
