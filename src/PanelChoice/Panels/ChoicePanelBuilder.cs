using System.Collections.Immutable;
using System.Globalization;
using System.Runtime.InteropServices;
using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>Puts the rows of a table together as persons, their occasions and choice sets.</summary>
public static class ChoicePanelBuilder
{
    /// <summary>More than these is no choice set but a wrong column, whose persons x alternatives would not fit into memory.</summary>
    private const int MostAlternatives = 1_000;

    /// <summary>Builds the panel. The order of rows in the file means nothing, except for the row numbers in messages.</summary>
    /// <param name="study">The study.</param>
    /// <param name="table">The table that was read for it.</param>
    /// <returns>
    /// The panel, or the problems: <c>study.unknown_alternative</c>, those of <see cref="NestTreeBuilder"/>,
    /// <c>study.previous_does_not_fit</c>, <c>data.duplicate</c>, <c>data.several_occasions</c>, <c>data.none_chosen</c>,
    /// <c>data.several_chosen</c>, <c>data.chosen_not_offered</c>, <c>data.weight_not_positive</c>, <c>data.weight_not_constant</c>,
    /// <c>data.cluster_not_constant</c>, <c>data.second_cluster_not_constant</c>, <c>data.too_many_alternatives</c>.
    /// </returns>
    public static Checked<ChoicePanel> Build(StudySpecification study, ChoiceTable table)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(table);
        if (TooMany(study, table.File, table.Alternative.Levels) is { } many) return Checked<ChoicePanel>.Bad([many]);
        var problems = new ProblemList();
        StudyFit.Check(study, table.Alternative.Levels, table.OccasionKind, problems);
        var panel = Build(study, table, NameOrder.Of(table.Person.Levels), ClusterNames.Of(study, table), problems);
        return panel is null ? Checked<ChoicePanel>.Bad(ProblemList.InRowOrder(problems)) : Checked<ChoicePanel>.Good(panel);
    }

    /// <summary>Builds the panel of a table, or of a part of one that holds whole persons.</summary>
    /// <param name="study">The study.</param>
    /// <param name="table">The table.</param>
    /// <param name="personOrder">Person codes of the table in the panel's order.</param>
    /// <param name="clusters">Order of the clusters of the whole panel; null where persons are the clusters.</param>
    /// <param name="problems">Takes what is wrong with its rows, besides what is there already.</param>
    /// <returns>The panel; null where there are problems.</returns>
    internal static ChoicePanel? Build(StudySpecification study, ChoiceTable table, int[] personOrder, ClusterNames? clusters, ProblemList problems)
    {
        var order = RowOrder.Of(table, NameOrder.Ranks(personOrder));
        var (occasionStart, personStart) = Check(study, table, order, problems);
        return problems.IsEmpty ? Assemble(study, table, personOrder, clusters, order, occasionStart, personStart) : null;
    }

    /// <summary>The problem of a column that holds anything but alternatives; null where it holds few enough.</summary>
    internal static Problem? TooMany(StudySpecification study, string file, ImmutableArray<string> alternatives) => alternatives.Length <= MostAlternatives
        ? null
        : new Problem(
            "data.too_many_alternatives", file,
            string.Create(CultureInfo.InvariantCulture, $"the column holds {alternatives.Length:#,0} alternatives, and a panel can have {MostAlternatives:#,0}"),
            "name the column of alternatives under [panel] alternative, or join alternatives") { Column = study.Panel.Alternative };

    /// <summary>Finds where occasions begin in the ordered rows (with a closing entry), and where persons begin among the occasions, checking each.</summary>
    private static (List<int> OccasionStart, int[] PersonStart) Check(StudySpecification study, ChoiceTable table, RowOrder order, ProblemList problems)
    {
        var checks = new ChoiceSetChecks(study, table, problems);
        var rows = order.Rows.AsSpan();
        var occasionStart = new List<int>();
        var personStart = new int[order.PersonStart.Length];
        for (var p = 0; p + 1 < order.PersonStart.Length; p++)
        {
            personStart[p] = occasionStart.Count;
            checks.CheckPerson(rows[order.PersonStart[p]..order.PersonStart[p + 1]]);
            for (var from = order.PersonStart[p]; from < order.PersonStart[p + 1];)
            {
                var to = from + 1;
                while (to < order.PersonStart[p + 1] && table.Occasion[rows[to]] == table.Occasion[rows[from]]) to++;
                checks.CheckOccasion(rows[from..to]);
                occasionStart.Add(from);
                from = to;
            }
        }

        personStart[^1] = occasionStart.Count;
        occasionStart.Add(rows.Length);
        return (occasionStart, personStart);
    }

    private static ChoicePanel Assemble(
        StudySpecification study, ChoiceTable table, int[] personOrder, ClusterNames? clusters, RowOrder order, List<int> occasionStart, int[] personStart)
    {
        var alternatives = table.Alternative.Levels.Length;
        var occasions = occasionStart.Count - 1;
        var personOf = new int[occasions];
        var occasion = new long[occasions];
        var chosen = new int[occasions];
        var row = new int[checked(occasions * alternatives)];
        var offered = new bool[row.Length];
        var second = SecondGrouping.Of(study) is { Column: { } column } ? table.Texts[column] : null;
        var secondCluster = new int[second is null ? 0 : occasions];
        Array.Fill(row, -1);
        for (var p = 0; p + 1 < personStart.Length; p++)
            for (var o = personStart[p]; o < personStart[p + 1]; o++)
            {
                personOf[o] = p;
                for (var i = occasionStart[o]; i < occasionStart[o + 1]; i++)
                {
                    var r = order.Rows[i];
                    var alternative = table.Alternative.Codes[r];
                    occasion[o] = table.Occasion[r];
                    row[(o * alternatives) + alternative] = r;
                    offered[(o * alternatives) + alternative] = table.Offered[r];
                    if (table.Chosen[r]) chosen[o] = alternative;
                    if (second is not null && second.Codes[r] != CodedColumn.NoValue) secondCluster[o] = second.Codes[r];
                }
            }

        var persons = personOrder.Select(p => table.Person.Levels[p]).ToImmutableArray();
        return new ChoicePanel(
            table, persons, table.Alternative.Levels, Immutable(personStart), Immutable(personOf), Immutable(occasion), Immutable(row), Immutable(offered),
            Immutable(chosen), Weights(table, order), study.Inference.Cluster, clusters?.Names ?? persons, ClusterOf(study, table, order, clusters))
        {
            SecondCluster = Immutable(secondCluster),
        };
    }

    private static ImmutableArray<double> Weights(ChoiceTable table, RowOrder order)
    {
        var weights = new double[order.PersonStart.Length - 1];
        Array.Fill(weights, 1);
        if (table.Weight.IsEmpty) return Immutable(weights);
        for (var p = 0; p < weights.Length; p++)
            weights[p] = table.Weight[FirstRowWith(order, p, r => !double.IsNaN(table.Weight[r]))];
        return Immutable(weights);
    }

    private static ImmutableArray<int> ClusterOf(StudySpecification study, ChoiceTable table, RowOrder order, ClusterNames? clusters)
    {
        var persons = Enumerable.Range(0, order.PersonStart.Length - 1);
        if (clusters is null) return [.. persons];
        var column = table.Texts[study.Inference.Cluster];
        return [.. persons.Select(p => clusters.Rank[column.Codes[FirstRowWith(order, p, r => column.Codes[r] != CodedColumn.NoValue)]])];
    }

    /// <summary>The person's first row with a value: every person has an offered row, because the chosen one is, and there no cell is empty.</summary>
    private static int FirstRowWith(RowOrder order, int person, Func<int, bool> hasValue)
    {
        for (var i = order.PersonStart[person]; i < order.PersonStart[person + 1]; i++)
            if (hasValue(order.Rows[i])) return order.Rows[i];
        throw new InvalidOperationException("A person without any offered row passed the checks.");
    }

    private static ImmutableArray<T> Immutable<T>(T[] values) => ImmutableCollectionsMarshal.AsImmutableArray(values);
}
